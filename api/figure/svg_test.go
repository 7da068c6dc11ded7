package figure

import (
	"encoding/xml"
	"io"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"
)

// parse reads an SVG document and returns the text of every element of a name; it
// fails where the document is not well formed.
func parse(t rapid.TB, doc []byte, name string) (texts []string) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(string(doc)))
	d.Strict = true
	inside := false
	for {
		tok, err := d.Token()
		if err == io.EOF {
			return texts
		}
		if err != nil {
			t.Fatalf("not well formed: %v\n%s", err, doc)
		}
		switch x := tok.(type) {
		case xml.StartElement:
			if inside = x.Name.Local == name; inside {
				texts = append(texts, "")
			}
		case xml.EndElement:
			inside = false
		case xml.CharData:
			if inside {
				texts[len(texts)-1] += string(x)
			}
		}
	}
}

// TestTextComesBack: given any text, when it is written as content and as an
// attribute, expect a document that a parser reads, with the same text but for
// characters that XML does not have.
func TestTextComesBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.OneOf(rapid.String(), rapid.StringOfN(rapid.RuneFrom([]rune("<>&\"'\x00\x01\n\t]]>")), 0, 20, -1)).Draw(t, "text")
		var c canvas
		c.start("svg", attrs{"about", s})
		c.content("text", s, attrs{"x", "1"})
		c.leaf("path", attrs{"d", s})
		c.end()
		got := parse(t, c.b, "text")
		want := strings.Map(func(r rune) rune {
			switch {
			case r == '\n' || r == '\t' || r == '\r':
				return ' '
			case r < ' ' || r == 0xFFFE || r == 0xFFFF:
				return utf8.RuneError
			}
			return r
		}, s)
		if len(got) != 1 || got[0] != want {
			t.Fatalf("%q came back as %q", s, got)
		}
	})
}

// TestNumbers: what readers see and what renderers read.
func TestNumbers(t *testing.T) {
	for _, c := range []struct {
		x        float64
		decimals int
		want     string
	}{
		{-72.4, 1, "\u221272.4"}, {-0.04, 1, "0.0"}, {48.2, 0, "48"}, {999.96, 1, "1000.0"},
	} {
		if got := number(c.x, c.decimals); got != c.want {
			t.Errorf("number(%g, %d) is %q, want %q", c.x, c.decimals, got, c.want)
		}
	}
	for x, want := range map[float64]string{-0.04: "0", 12.34: "12.3", -7: "-7", 1e6: "1000000"} {
		if got := px(x); got != want {
			t.Errorf("px(%g) is %q, want %q", x, got, want)
		}
	}
}

// TestWrap: no line is wider than asked for, and no letter is lost.
func TestWrap(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringOfN(rapid.RuneFrom([]rune("abcW  il.-\u00e9\u9707")), 0, 300, -1).Draw(t, "text")
		width := rapid.Float64Range(60, 900).Draw(t, "width")
		lines := wrap(s, 12, width)
		for _, l := range lines {
			if w := textWidth(l, 12); w > width {
				t.Fatalf("%q is %g wide, the bound is %g", l, w, width)
			}
		}
		if got, want := strings.ReplaceAll(strings.Join(lines, ""), " ", ""), strings.Join(strings.Fields(s), ""); got != want {
			t.Fatalf("%q became %q", want, got)
		}
	})
	if got := wrap("one two three", 10, 50); len(got) != 2 || got[0] != "one two" {
		t.Errorf("wrapped into %q", got)
	}
}

// TestFit: true scale where it fits, a stated exaggeration where a section is flat.
func TestFit(t *testing.T) {
	for _, c := range []struct {
		name            string
		width, depth    float64
		k, exaggeration float64
	}{
		{"as wide as the plot", 800, 300, 1, 1},
		{"as high as the plot", 400, 1200, 0.5, 1},
		{"flat", 800, 100, 1, 2},
		{"very flat", 1600, 50, 0.5, 10},
		{"flat beyond all bounds", 8000, 10, 0.1, 20},
	} {
		t.Run(c.name, func(t *testing.T) {
			k, e := fit(c.width, c.depth, 800, 600, 170)
			if k != c.k || e != c.exaggeration {
				t.Errorf("%g px a km, exaggerated %g times; want %g, %g", k, e, c.k, c.exaggeration)
			}
		})
	}
}

// TestTicks: within the range, on multiples of a step, and apart.
func TestTicks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		from := rapid.Float64Range(-500, 100).Draw(t, "from")
		to := from + rapid.Float64Range(50, 3000).Draw(t, "span")
		k := 800 / (to - from)
		at := ticks(from, to, tickStep(k, 50))
		if len(at) < 1 || len(at) > 17 {
			t.Fatalf("%d ticks from %g to %g", len(at), from, to)
		}
		for i, x := range at {
			if x < from || x > to || i > 0 && (x-at[i-1])*k < 50-1e-9 {
				t.Fatalf("ticks %v from %g to %g, %g px a km", at, from, to, k)
			}
		}
	})
}

// TestLooksComplete: every class has a dark form, and colours that differ from it.
func TestLooksComplete(t *testing.T) {
	sheet := styleSheet()
	if strings.Count(sheet, "{") != len(looks)+1 || strings.Count(sheet, "{") != strings.Count(sheet, "}") {
		t.Errorf("the style sheet has not one rule a class: %s", sheet)
	}
	for name, l := range looks {
		if !strings.Contains(l.dark, "#") {
			t.Errorf("class %s has no colour on a dark screen", name)
		}
		for i := 1; i < len(l.attrs); i += 2 {
			if strings.HasPrefix(l.attrs[i], "#") && strings.Contains(l.dark, l.attrs[i-1]+":"+l.attrs[i]) {
				t.Errorf("class %s has the same colour on a dark screen", name)
			}
		}
	}
	dashes := map[string]string{}
	for i := range numSlabLooks {
		name := class("slab", i)
		dash := ""
		for j := 0; j < len(looks[name].attrs); j += 2 {
			if looks[name].attrs[j] == "stroke-dasharray" {
				dash = looks[name].attrs[j+1]
			}
		}
		if other, ok := dashes[dash]; ok {
			t.Errorf("%s and %s have the same pattern %q", name, other, dash)
		}
		dashes[dash] = name
	}
}
