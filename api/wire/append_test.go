package wire

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"

	"nearmargin/setting"
)

// checkString compares AppendString with what encoding/json makes of the string.
func checkString(t require, s string) {
	b := AppendString([]byte("x"), s)
	if b[0] != 'x' {
		t.Fatalf("%q: what stood before is gone: %q", s, b)
	}
	b = b[1:]
	theirs, err := json.Marshal(s)
	if err != nil {
		t.Fatalf("%q: %v", s, err)
	}
	var got, want string
	if err := json.Unmarshal(b, &got); err != nil {
		t.Fatalf("%q: %v in %s", s, err, b)
	}
	if err := json.Unmarshal(theirs, &want); err != nil {
		t.Fatalf("%q: %v in %s", s, err, theirs)
	}
	if got != want || !utf8.Valid(b) {
		t.Fatalf("%q becomes %q, with encoding/json %q", s, got, want)
	}
	if bytes.ContainsFunc(b, func(r rune) bool { return r < ' ' }) {
		t.Fatalf("%q: a control character stands bare in %q", s, b)
	}
}

var strange = []string{
	"", "plain", `"quoted" \ back`, "a\nb\rc\td", "\x00\x01\x1f\x7f", "süd Ω 日本 🌋", "\xff", "a\xc3", "\xed\xa0\x80", "<&>", "\u2028\u2029\uFFFD", strings.Repeat("ü", 1000),
}

func TestAppendString(t *testing.T) {
	for _, s := range strange {
		checkString(t, s)
	}
	rapid.Check(t, func(t *rapid.T) {
		if rapid.Bool().Draw(t, "text") {
			checkString(t, rapid.String().Draw(t, "s"))
			return
		}
		checkString(t, string(rapid.SliceOf(rapid.Byte()).Draw(t, "bytes")))
	})
}

// FuzzAppendString compares with encoding/json.
func FuzzAppendString(f *testing.F) {
	for _, s := range strange {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) { checkString(t, s) })
}

func TestAppendRounded(t *testing.T) {
	for _, c := range []struct {
		x        float64
		decimals int
		want     string
	}{
		{0, 2, "0"}, {math.Copysign(0, -1), 2, "0"}, {-0.004, 2, "0"}, {-0.005, 2, "-0.01"}, {1.005, 1, "1"}, {12.50, 2, "12.5"},
		{999999.999, 2, "1000000"}, {1e15, 2, "1000000000000000"}, {-72.4, 6, "-72.4"}, {1e-9, 6, "0"}, {359.96, 1, "360"},
		{math.NaN(), 2, ""}, {math.Inf(1), 2, ""}, {math.Inf(-1), 2, ""},
	} {
		if got := string(appendRounded(nil, c.x, c.decimals)); got != c.want {
			t.Errorf("appendRounded(%g, %d) = %q, want %q", c.x, c.decimals, got, c.want)
		}
	}
}

func TestRoundingStaysInRange(t *testing.T) {
	for _, c := range []struct{ x, below, want float64 }{
		{359.94, 360, 359.9}, {359.95, 360, 0}, {360, 360, 0}, {179.96, 180, 0}, {0.04, 180, 0}, {179.96, 360, 180},
	} {
		if got := roundAzimuth(c.x, c.below); got != c.want {
			t.Errorf("roundAzimuth(%g, %g) = %g, want %g", c.x, c.below, got, c.want)
		}
	}
	if !math.IsNaN(roundAzimuth(math.NaN(), 360)) {
		t.Error("NaN must stay NaN")
	}
	for _, c := range []struct{ x, want float64 }{
		{180, 180}, {179.99999, 180}, {-179.99999, 180}, {-179.9999, -179.9999}, {-179.99996, 180}, {0, 0},
	} {
		if got := roundLon(c.x, 4); got != c.want {
			t.Errorf("roundLon(%g) = %g, want %g", c.x, got, c.want)
		}
	}
}

// TestNothingThatIsNoNumber: no value of an answer prints as NaN or Inf, not even
// one that the domain should never give.
func TestNothingThatIsNoNumber(t *testing.T) {
	var a setting.Answer
	if err := lookups(t)[0].At(setting.SiteAt(62.2, -12), &a); err != nil {
		t.Fatal(err)
	}
	if a.Slabs.Len() == 0 || a.Nearby.Len() == 0 {
		t.Fatal("the site has no slab below it or no other boundary near")
	}
	for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		a.Site.DepthKm, a.Site.UncertaintyKm = x, x
		for _, b := range []*setting.BoundaryAnswer{&a.Nearest, &a.Controlling} {
			b.DistanceKm, b.SigmaKm, b.AzimuthDeg = x, x, x
			m := &b.Motion
			m.RateMmYr, m.RateSigmaMmYr, m.AzimuthDeg, m.AzimuthSigmaDeg = x, x, x, x
			m.OpeningMmYr, m.ShearMmYr, m.ObliquityDeg = x, x, x
		}
		for i := range a.Slabs.All() {
			y := &a.Slabs.All()[i]
			y.DepthKm, y.SigmaKm, y.DipDeg, y.DipAzimuthDeg, y.ClearanceKm, y.Distance3DKm = x, x, x, x, x, x
		}
		for i := range a.Nearby.All() {
			a.Nearby.All()[i].DistanceKm, a.Nearby.All()[i].AzimuthDeg = x, x
		}
		b := AppendAnswer(nil, &a)
		if !json.Valid(b) {
			t.Errorf("%g: not JSON: %s", x, b)
		}
		var c Cells
		c.Set(&a)
		for i := range Columns {
			if i == colReason {
				continue // words
			}
			if v := string(c.Value(i)); strings.Contains(v, "NaN") || strings.Contains(v, "Inf") {
				t.Errorf("%g: column %s holds %q", x, Columns[i], v)
			}
		}
	}
}
