package api

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/access"
)

// send sends a request with headers given as name, value, name, value.
func (r *rig) send(method, target string, header ...string) *httptest.ResponseRecorder {
	req := httptest.NewRequest(method, target, nil)
	for i := 0; i < len(header); i += 2 {
		req.Header.Add(header[i], header[i+1])
	}
	w := httptest.NewRecorder()
	r.ServeHTTP(w, req)
	return w
}

func tokens(t *testing.T) *access.Ring {
	t.Helper()
	sum := func(s string) string { x := sha256.Sum256([]byte(s)); return hex.EncodeToString(x[:]) }
	list, err := access.ParseTokens("app query " + sum("q-secret") + "\njob query,batch " + sum("b-secret") + "\nother batch " + sum("o-secret"))
	if err != nil {
		t.Fatal(err)
	}
	return access.NewRing(list)
}

// TestTokensAreAsked: given tokens, expect 401 and 403 with a challenge and a
// problem document, and nothing of a token in the answer, the log or the metrics.
func TestTokensAreAsked(t *testing.T) {
	r := newLimitedRig(t, func(c *Config) { c.Access.Tokens = tokens(t) })
	const point, auth = "/v1/point?lon=1&lat=2", "Authorization"
	for _, c := range []struct {
		name, method, target string
		header               []string
		status               int
		challenge            string
	}{
		{"none", "GET", point, nil, 401, `Bearer realm="nearmargin"`},
		{"right", "GET", point, []string{auth, "Bearer q-secret"}, 200, ""},
		{"other letter case of the scheme", "GET", point, []string{auth, "bearer q-secret"}, 200, ""},
		{"wrong", "GET", point, []string{auth, "Bearer x-secret"}, 401, "invalid_token"},
		{"empty", "GET", point, []string{auth, "Bearer "}, 401, "invalid_request"},
		{"basic", "GET", point, []string{auth, "Basic cS1zZWNyZXQ6"}, 401, "invalid_request"},
		{"two", "GET", point, []string{auth, "Bearer q-secret", auth, "Bearer b-secret"}, 401, "invalid_request"},
		{"of another scope", "POST", "/v1/annotate", []string{auth, "Bearer q-secret", "Content-Type", "text/csv"}, 403, "insufficient_scope"},
		{"of the scope", "POST", "/v1/annotate", []string{auth, "Bearer b-secret", "Content-Type", "application/x-ndjson"}, 200, ""},
		{"in the query", "GET", point + "&access_token=q-secret", nil, 401, "Bearer"},
		{"health needs none", "GET", "/healthz", nil, 200, ""},
		{"nor does readiness", "GET", "/readyz", nil, 200, ""},
		{"nor the description", "GET", "/openapi.json", nil, 200, ""},
		{"models need one", "GET", "/v1/models/" + "made-up", nil, 401, "Bearer"},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := r.send(c.method, c.target, c.header...)
			if w.Code != c.status || !strings.Contains(w.Header().Get("WWW-Authenticate"), c.challenge) {
				t.Fatalf("status %d, challenge %q: %s", w.Code, w.Header().Get("WWW-Authenticate"), w.Body)
			}
			if strings.Contains(w.Body.String(), "secret") {
				t.Errorf("the answer tells the token: %s", w.Body)
			}
			if c.status >= 400 {
				if p := problem(t, w); len(p.Errors) != 1 || p.Errors[0].Parameter != auth {
					t.Errorf("%+v", p)
				}
			}
		})
	}
	for path, scope := range scopes {
		if scope == "" || r.send(http.MethodGet, strings.Replace(path, ":id", "x", 1)).Code == http.StatusOK {
			t.Errorf("%s answers without a token", path)
		}
	}
	for _, route := range r.echo.Routes() {
		if _, ok := scopes[route.Path]; !ok && strings.HasPrefix(route.Path, "/v1/") {
			t.Errorf("%s has no scope", route.Path)
		}
	}
	text := r.log.b.String() + r.get("/metrics").Body.String()
	if strings.Contains(text, "secret") || !strings.Contains(text, `"token":"job"`) {
		t.Errorf("the log tells a token, or not its holder: %s", text)
	}
}

func TestRateLimit(t *testing.T) {
	now := time.Unix(1_700_000_000, 0)
	r := newLimitedRig(t, func(c *Config) { c.Access.Rate = access.NewLimiter(1, 2, func() time.Time { return now }) })
	const target = "/v1/point?lon=1&lat=2"
	for i, want := range []int{200, 200, 429} {
		w := r.get(target)
		if w.Code != want {
			t.Fatalf("request %d: status %d, want %d", i+1, w.Code, want)
		}
		if want == 429 {
			if p := problem(t, w); w.Header().Get("Retry-After") != "1" || p.Type != problemType+"too-many-requests" || len(p.Errors) != 1 || !strings.Contains(p.Detail, "1 times a second and 2 at once") {
				t.Errorf("Retry-After %q, %+v", w.Header().Get("Retry-After"), p)
			}
		}
	}
	if w := r.get("/healthz"); w.Code != 200 {
		t.Errorf("a probe: status %d", w.Code)
	}
	// a made-up forwarded address is no other client where no proxy is believed
	if w := r.send("GET", target, "X-Forwarded-For", "203.0.113.9"); w.Code != 429 {
		t.Errorf("with a made-up address: status %d", w.Code)
	}
}

// TestForwardedAddress: X-Forwarded-For counts only where the connection comes
// from a proxy that is believed, and only up to the first address that is not one.
func TestForwardedAddress(t *testing.T) {
	proxies, err := access.ParseProxies("192.0.2.0/24")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ name, remote, forwarded, want string }{
		{"through the proxy", "192.0.2.1:99", "198.51.100.7", "198.51.100.7"},
		{"made up before the proxy", "192.0.2.1:99", "203.0.113.1, 198.51.100.7", "198.51.100.7"},
		{"through two proxies", "192.0.2.1:99", "198.51.100.7, 192.0.2.9", "198.51.100.7"},
		{"not through the proxy", "198.51.100.8:99", "203.0.113.1", "198.51.100.8"},
		{"loopback is not believed", "127.0.0.1:99", "203.0.113.1", "127.0.0.1"},
		{"nothing forwarded", "192.0.2.1:99", "", "192.0.2.1"},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := newLimitedRig(t, func(c *Config) { c.Access.Proxies = proxies })
			req := httptest.NewRequest("GET", "/healthz", nil)
			req.RemoteAddr = c.remote
			if c.forwarded != "" {
				req.Header.Set("X-Forwarded-For", c.forwarded)
			}
			r.ServeHTTP(httptest.NewRecorder(), req)
			if got := r.log.records(t)[0]["client"]; got != c.want {
				t.Errorf("client %v, want %s", got, c.want)
			}
		})
	}
}

func TestCrossOrigin(t *testing.T) {
	origins, err := access.ParseOrigins("https://maps.example.org")
	if err != nil {
		t.Fatal(err)
	}
	const mine, allow = "https://maps.example.org", "Access-Control-Allow-Origin"
	r := newLimitedRig(t, func(c *Config) { c.Access.Origins, c.Access.Tokens = origins, tokens(t) })
	w := r.send("OPTIONS", "/v1/annotate", "Origin", mine, "Access-Control-Request-Method", "POST")
	if w.Code != 204 || w.Header().Get(allow) != mine || !strings.Contains(w.Header().Get("Access-Control-Allow-Headers"), "Authorization") {
		t.Errorf("preflight: status %d, %v", w.Code, w.Header())
	}
	w = r.send("GET", "/v1/point?lon=1&lat=2", "Origin", mine)
	if w.Code != 401 || w.Header().Get(allow) != mine || w.Header().Get("Vary") != "Origin" {
		t.Errorf("a problem must be readable too: status %d, %v", w.Code, w.Header())
	}
	w = r.send("GET", "/healthz", "Origin", "https://evil.example")
	if w.Header().Get(allow) != "" || w.Header().Get("Vary") != "Origin" {
		t.Errorf("another origin: %v", w.Header())
	}
	// an app of the origin can ask whether an answer that it holds is still right
	for _, target := range []string{"/v1/section?lon=62.2&lat=-5", "/reference"} {
		w = r.send("GET", target, "Origin", mine, "Authorization", "Bearer q-secret")
		if vary := strings.Join(w.Header().Values("Vary"), ", "); w.Code != 200 || !strings.Contains(vary, "Origin") || !strings.Contains(vary, "Accept") {
			t.Errorf("%s: status %d, Vary %q", target, w.Code, vary)
		}
		if e := w.Header().Get("Access-Control-Expose-Headers"); w.Header().Get("ETag") == "" || !strings.Contains(e, "ETag") {
			t.Errorf("%s: the page may read %q", target, e)
		}
	}
	w = r.send("OPTIONS", "/v1/point", "Origin", mine, "Access-Control-Request-Method", "GET")
	if !strings.Contains(w.Header().Get("Access-Control-Allow-Headers"), "If-None-Match") {
		t.Errorf("preflight: %v", w.Header())
	}
	w = newRig(t).send("GET", "/healthz", "Origin", mine)
	if w.Header().Get(allow) != "" {
		t.Errorf("without configuration: %v", w.Header())
	}
}

func TestRequestIDs(t *testing.T) {
	r := newRig(t)
	seen := map[string]bool{}
	for _, c := range []struct {
		name  string
		given []string
		kept  bool
	}{
		{"given", []string{"job-7.A_b"}, true},
		{"none", nil, false},
		{"two", []string{"a", "b"}, false},
		{"empty", []string{""}, false},
		{"too long", []string{strings.Repeat("x", 65)}, false},
		{"made for the log", []string{"a\" level=ERROR"}, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			var header []string
			for _, id := range c.given {
				header = append(header, "X-Request-Id", id)
			}
			got := r.send("GET", "/v1/point?lon=x", header...).Header().Get("X-Request-Id")
			recs := r.log.records(t)
			if last := recs[len(recs)-1]["request_id"]; last != got {
				t.Errorf("answered %q, logged %v", got, last)
			}
			if c.kept != (len(c.given) == 1 && got == c.given[0]) || !requestIDForm.MatchString(got) || seen[got] {
				t.Errorf("id %q", got)
			}
			seen[got] = true
		})
	}
}

func TestBasePath(t *testing.T) {
	r := newLimitedRig(t, func(c *Config) { c.BasePath = "/earth/tectonics" })
	for target, want := range map[string]int{
		"/earth/tectonics/v1/point?lon=1&lat=2":           200,
		"/earth/tectonics/v1/models/made-up%407":          200,
		"/earth/tectonics/healthz":                        200,
		"/healthz":                                        200,
		"/readyz":                                         200,
		"/v1/point?lon=1&lat=2":                           404,
		"/earth/tectonicsv1/point?lon=1&lat=2":            404,
		"/earth/v1/point?lon=1&lat=2":                     404,
		"/earth/tectonics/earth/tectonics/v1/point?lon=1": 404,
		"/earth/tectonics":                                308,
		"/earth/tectonics/":                               200,
		"/earth/tectonics/assets/app.js":                  200,
		"/assets/app.js":                                  404,
		"/earth%2ftectonics/v1/point?lon=1&lat=2":         404,
		"/earth/tectonics/../../v1/point?lon=1&lat=2":     404,
		"/earth/tectonics/v1/annotate?x=1":                405,
	} {
		w := r.get(target)
		if w.Code != want {
			t.Errorf("%s: status %d, want %d", target, w.Code, want)
		}
	}
	if to := r.get("/earth/tectonics?x=1").Header().Get("Location"); to != "tectonics/?x=1" {
		t.Errorf("the base path leads to %q", to)
	}
	for base, ok := range map[string]bool{"": true, "/a": true, "/a/b-c.d~e_f": true, "a": false, "/": false, "/a/": false, "//a": false, "/a/../b": false, "/a b": false, "/{x}": false} {
		if err := CheckBasePath(base); (err == nil) != ok {
			t.Errorf("%q: %v", base, err)
		}
	}
}

// TestPanicIsAnswered: a panic of a handler is a 500 without its cause, a record
// with the stack, and a count.
func TestPanicIsAnswered(t *testing.T) {
	r := newRig(t)
	r.echo.GET("/defect", func(echo.Context) error { panic("the secret cause") })
	w := r.get("/defect")
	p := problem(t, w)
	if w.Code != 500 || strings.Contains(fmt.Sprint(p), "secret") {
		t.Errorf("status %d, %+v", w.Code, p)
	}
	if text := r.get("/metrics").Body.String(); !strings.Contains(text, "nearmargin_panics_total 1\n") {
		t.Error("the panic is not counted")
	}
	recs := r.log.records(t)
	if recs[0]["msg"] != "panic" || recs[0]["panic"] != "the secret cause" || !strings.Contains(fmt.Sprint(recs[0]["stack"]), "admit_test.go") {
		t.Errorf("logged %v", recs[0])
	}
}
