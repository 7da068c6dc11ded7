package access

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"
)

func sumOf(token string) string {
	s := sha256.Sum256([]byte(token))
	return hex.EncodeToString(s[:])
}

func TestTokens(t *testing.T) {
	text := "# the field crew\n\nfield query " + sumOf("old") + "\nfield query,batch " + sumOf("new") + "\r\nlab batch " + sumOf("lab") + ";desk query " + sumOf("desk")
	tokens, err := ParseTokens(text)
	if err != nil {
		t.Fatal(err)
	}
	if tokens.Len() != 4 {
		t.Errorf("%d tokens, want 4", tokens.Len())
	}
	for _, c := range []struct {
		name, token, holder string
		found, query, batch bool
	}{
		{"first of two", "old", "field", true, true, false},
		{"second of two", "new", "field", true, true, true},
		{"batch alone", "lab", "lab", true, false, true},
		{"after a semicolon", "desk", "desk", true, true, false},
		{"unknown", "none", "", false, false, false},
		{"empty", "", "", false, false, false},
		{"the sum itself", sumOf("old"), "", false, false, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			g, ok := tokens.Find(c.token)
			if ok != c.found || g.Name != c.holder || g.Allows(Query) != c.query || g.Allows(Batch) != c.batch {
				t.Errorf("found %v, holder %q, query %v, batch %v", ok, g.Name, g.Allows(Query), g.Allows(Batch))
			}
		})
	}
	if (*Tokens)(nil).Len() != 0 {
		t.Error("no tokens are some")
	}
}

// TestBadTokens: an error names the line and tells nothing of what stands there.
func TestBadTokens(t *testing.T) {
	secret := "correct-horse-battery"
	for _, c := range []struct{ name, text, want string }{
		{"a token in place of its sum", "a query " + secret, "not the token"},
		{"two fields", "\nquery " + secret, "line 2: 2 fields"},
		{"unknown scope", "a " + secret + " " + sumOf("x"), "unknown scope"},
		{"no scope", "a , " + sumOf("x"), "unknown scope"},
		{"a name of signs", "a/" + secret + "! query " + sumOf("x"), "name must be"},
		{"a short sum", "a query " + sumOf("x")[:62], "64 hexadecimal"},
		{"twice", "a query " + sumOf("x") + "\nb query " + sumOf("x"), "line 2: the sum of b stands twice"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := ParseTokens(c.text)
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Fatalf("%v, want %q", err, c.want)
			}
			if strings.Contains(err.Error(), secret) {
				t.Errorf("the error tells the secret: %v", err)
			}
		})
	}
}

func TestLimiter(t *testing.T) {
	now := time.Unix(1_700_000_000, 0)
	l := NewLimiter(0.5, 3, func() time.Time { return now })
	for i := range 3 {
		if _, ok := l.Allow("a"); !ok {
			t.Fatalf("request %d of the burst is refused", i+1)
		}
	}
	wait, ok := l.Allow("a")
	if ok || wait != 2*time.Second {
		t.Errorf("beyond the burst: allowed %v, wait %v, want 2s", ok, wait)
	}
	if _, ok := l.Allow("b"); !ok {
		t.Error("one client takes another's allowance")
	}
	now = now.Add(wait)
	if _, ok := l.Allow("a"); !ok {
		t.Error("refused after the wait it was told")
	}
	now = now.Add(-time.Hour) // the clock is set back
	if wait, ok := l.Allow("a"); ok || wait != 2*time.Second {
		t.Errorf("after the clock was set back: allowed %v, wait %v, want 2s", ok, wait)
	}
	now = now.Add(2 * time.Second)
	if _, ok := l.Allow("a"); !ok {
		t.Error("refused after the wait it was told, because the clock was set back before")
	}
}

// TestLimiterWhenTheClockIsSet: however the clock is set between requests, a client
// that waits as long as it is told is let in, no wait is longer than one token takes,
// and no more are let in than the burst and the time that passed forward allow.
func TestLimiterWhenTheClockIsSet(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		perSecond := rapid.SampledFrom([]float64{0.1, 0.5, 1, 20, 1000}).Draw(t, "requests a second")
		burst := rapid.IntRange(1, 5).Draw(t, "burst")
		now := time.Unix(1_700_000_000, 0)
		l := NewLimiter(perSecond, burst, func() time.Time { return now })
		longest := time.Duration(max(1, math.Ceil(1/perSecond))) * time.Second
		admitted, forward := 0, time.Duration(0)
		set := func(d time.Duration) {
			now = now.Add(d)
			forward += max(0, d)
		}
		for range rapid.IntRange(1, 60).Draw(t, "requests") {
			step := rapid.OneOf(rapid.Int64Range(0, 2000), rapid.Int64Range(-48*3600_000, 48*3600_000)).Draw(t, "clock moves by, ms")
			set(time.Duration(step) * time.Millisecond)
			wait, ok := l.Allow("a")
			if ok {
				admitted++
				continue
			}
			if wait < time.Second || wait > longest {
				t.Fatalf("told to wait %v, want 1s to %v", wait, longest)
			}
			set(wait)
			if _, ok := l.Allow("a"); !ok {
				t.Fatalf("refused after a wait of %v", wait)
			}
			admitted++
		}
		if most := float64(burst) + forward.Seconds()*perSecond + 1e-6; float64(admitted) > most {
			t.Fatalf("%d requests let in, want at most %g", admitted, most)
		}
	})
}

// TestLimiterMemory: made-up addresses take bounded memory, share one allowance
// once there are too many, and make room once they are at rest.
func TestLimiterMemory(t *testing.T) {
	now := time.Unix(1_700_000_000, 0)
	l := NewLimiter(1, 1, func() time.Time { return now })
	refused := 0
	for i := range MaxClients + 100 {
		if _, ok := l.Allow(fmt.Sprint(i)); !ok {
			refused++
		}
	}
	if len(l.clients) != MaxClients || refused != 99 {
		t.Errorf("%d clients kept, %d refused; want %d and 99", len(l.clients), refused, MaxClients)
	}
	now = now.Add(2 * time.Second)
	if _, ok := l.Allow("late"); !ok || len(l.clients) != 1 {
		t.Errorf("after a rest: allowed %v, %d clients kept, want 1", ok, len(l.clients))
	}
}

func TestClientOf(t *testing.T) {
	for in, want := range map[string]string{
		"192.0.2.7": "192.0.2.7", "::ffff:192.0.2.7": "192.0.2.7", "2001:db8:1:2:3:4:5:6": "2001:db8:1:2::/64",
		"fe80::1%eth0": "fe80::/64", "": "unknown", "x": "unknown",
	} {
		if got := ClientOf(in); got != want {
			t.Errorf("%q: %q, want %q", in, got, want)
		}
	}
}

func TestOrigins(t *testing.T) {
	o, err := ParseOrigins("https://maps.example.org, http://localhost:3000")
	if err != nil {
		t.Fatal(err)
	}
	for origin, want := range map[string]bool{
		"https://maps.example.org": true, "http://localhost:3000": true, "http://maps.example.org": false,
		"https://maps.example.org.evil.example": false, "null": false, "": false, "https://maps.example.org:443": false,
	} {
		if got, ok := o.Allow(origin); ok != want || ok && got != origin {
			t.Errorf("%q: %q, %v", origin, got, ok)
		}
	}
	all, err := ParseOrigins("*")
	if got, ok := all.Allow("https://any.example"); err != nil || !ok || got != "*" {
		t.Errorf("all: %q, %v, %v", got, ok, err)
	}
	none, err := ParseOrigins(" ")
	if err != nil || none.Any() || !o.Any() || !all.Any() || (*Origins)(nil).Any() {
		t.Errorf("Any is wrong; %v", err)
	}
	for _, bad := range []string{"maps.example.org", "https://a.example/", "ftp://a.example", "https://*.example.org/x", "https://A.example?x", "://"} {
		if _, err := ParseOrigins(bad); err == nil {
			t.Errorf("%q is taken for an origin", bad)
		}
	}
}

func TestProxies(t *testing.T) {
	list, err := ParseProxies("10.1.0.0/16, 192.0.2.7,2001:db8::/32,")
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, n := range list {
		got = append(got, n.String())
	}
	if want := "10.1.0.0/16 192.0.2.7/32 2001:db8::/32"; strings.Join(got, " ") != want {
		t.Errorf("%v, want %s", got, want)
	}
	for _, bad := range []string{"0.0.0.0/0", "::/0", "proxy.example", "10.0.0.0/33", "fe80::1%eth0"} {
		if _, err := ParseProxies(bad); err == nil {
			t.Errorf("%q is taken for proxies", bad)
		}
	}
}
