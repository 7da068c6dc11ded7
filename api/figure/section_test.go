package figure

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/setting/slab"
)

func sectionOf(t rapid.TB, l *setting.Lookup, lon, lat, depthKm float64) *setting.Section {
	t.Helper()
	site := setting.SiteAt(lon, lat)
	site.DepthKm = depthKm
	s, err := l.Section(site)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func builtinLookup(t *testing.T) *setting.Lookup {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	l, err := b.Model.Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// size and numbers of an SVG document.
var (
	sizeForm   = regexp.MustCompile(`<svg [^>]*width="900" height="([0-9]+)" viewBox="0 0 900 ([0-9]+)"`)
	textForm   = regexp.MustCompile(`<text [^>]*x="(-?[0-9.]+)" y="(-?[0-9.]+)" font-size="([0-9.]+)"(?: text-anchor="(start|end|middle)")?( transform="[^"]*")?[^>]*>([^<]*)<`)
	noNumber   = regexp.MustCompile(`NaN|Inf|undefined|%!`)
	entityText = strings.NewReplacer("&lt;", "<", "&gt;", ">", "&quot;", `"`, "&amp;", "&")
)

// box is a text and about the room it takes, in px.
type box struct {
	text       string
	l, r, t, b float64
}

// textBoxes returns the texts of a figure that run level.
func textBoxes(doc []byte) (boxes []box) {
	for _, m := range textForm.FindAllSubmatch(doc, -1) {
		if strings.Contains(string(m[0]), "aria-hidden") || len(m[5]) > 0 {
			continue
		}
		x, _ := strconv.ParseFloat(string(m[1]), 64)
		y, _ := strconv.ParseFloat(string(m[2]), 64)
		size, _ := strconv.ParseFloat(string(m[3]), 64)
		text := entityText.Replace(string(m[6]))
		w := textWidth(text, size)
		switch string(m[4]) {
		case "end":
			x -= w
		case "middle":
			x -= w / 2
		}
		boxes = append(boxes, box{text, x, x + w, y - size*0.75, y + size*0.1})
	}
	return boxes
}

// checkFigure checks what holds for every figure: well formed, of its size, no
// number that is none, and no text that leaves it or lies on another.
func checkFigure(t rapid.TB, doc []byte) {
	t.Helper()
	parse(t, doc, "text")
	if bad := noNumber.Find(doc); bad != nil {
		t.Fatalf("%q in the figure:\n%s", bad, doc)
	}
	size := sizeForm.FindSubmatch(doc)
	if size == nil || string(size[1]) != string(size[2]) {
		t.Fatalf("no size of 900 by something: %.300s", doc)
	}
	height, _ := strconv.ParseFloat(string(size[1]), 64)
	boxes := textBoxes(doc)
	if len(boxes) < 20 {
		t.Fatalf("only %d texts", len(boxes))
	}
	for i, a := range boxes {
		if a.l < 0 || a.r > 900 || a.t < 0 || a.b > height {
			t.Errorf("%q leaves the figure: x %.0f to %.0f, y %.0f to %.0f", a.text, a.l, a.r, a.t, a.b)
		}
		for _, b := range boxes[:i] {
			if a.l < b.r && b.l < a.r && a.t < b.b && b.t < a.b {
				t.Errorf("%q lies on %q", a.text, b.text)
			}
		}
	}
}

var leadForm = regexp.MustCompile(`class="nm-lead"[^>]* stroke-width="0.8" d="M([0-9.]+) ([0-9.]+)L[0-9.]+ ([0-9.]+)"`)

// checkLeads checks that no line from a label to its mark runs through a label.
func checkLeads(t *testing.T, doc []byte) {
	t.Helper()
	leads := leadForm.FindAllSubmatch(doc, -1)
	if len(leads) == 0 {
		t.Error("no lead to a mark")
	}
	for _, m := range leads {
		x, _ := strconv.ParseFloat(string(m[1]), 64)
		top, _ := strconv.ParseFloat(string(m[2]), 64)
		low, _ := strconv.ParseFloat(string(m[3]), 64)
		for _, b := range textBoxes(doc) {
			if b.l < x && x < b.r && b.t < low && top < b.b {
				t.Errorf("a lead at x %.0f runs through %q", x, b.text)
			}
		}
	}
}

// TestFiguresOfSixSlabs: what a report needs is on the figure.
func TestFiguresOfSixSlabs(t *testing.T) {
	l := builtinLookup(t)
	none := math.NaN()
	for _, c := range []struct {
		name              string
		lon, lat, depthKm float64
		says              []string
	}{
		{"Chile", -72.4, -36.1, 25, []string{"Nazca (NZ) plate subducting below the South America (SA) plate", "Chile Trench \u00b1", "site at 25 km depth", "above the slab\u2019s top", "True scale"}},
		{"Kanto, two slabs", 139.9, 35.7, none, []string{"slab top \u00b1 1\u03c3: Philippine Sea slab below Kanto", "slab top \u00b1 1\u03c3: Japan (north-eastern Honshu)"}},
		{"Tonga", -176.5, -20, none, []string{"Tonga Trench", "arc band: slab top 60 to 170 km deep"}},
		{"Cascadia", -122.3, 45.5, none, []string{"Cascadia subduction zone", "Hayes et al. (2018)"}},
		{"Hellenic", 25.4, 36.4, 180, []string{"below the slab\u2019s top"}},
		{"Sumatra", 100.4, -0.5, none, []string{"Sumatra Trench"}},
		{"Himalaya, flat", 85, 28, none, []string{"Vertical exaggeration \u00d71.5", "Depth (km), exaggerated \u00d71.5", "colliding", "Distance from the plate boundary (km)"}},
		{"Pamir, no trench", 73, 38.5, none, []string{"Distance from the slab\u2019s up-dip edge (km)", "meets no trench"}},
		{"seaward of the trench", -74.5, -36, none, []string{"on the side that goes down; no slab known below it"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			doc := Section(sectionOf(t, l, c.lon, c.lat, c.depthKm))
			checkFigure(t, doc)
			checkLeads(t, doc)
			text := strings.Join(parse(t, doc, "text"), " ")
			for _, want := range append(c.says, "Depth (km)", "Distance from", l.Model().Ref(), "A screening aid", "Slab: ", "\u00b1 1\u03c3") {
				if !strings.Contains(text, want) {
					t.Errorf("the figure does not say %q: %s", want, text)
				}
			}
			if title := parse(t, doc, "title"); len(title) != 1 || !strings.HasPrefix(title[0], "Slab cross-section: ") {
				t.Errorf("title %q", title)
			}
			if desc := parse(t, doc, "desc"); len(desc) != 1 || len(desc[0]) < 100 {
				t.Errorf("description %q", desc)
			}
		})
	}
}

// TestFiguresOfAnySite draws sections all over the built-in model.
func TestFiguresOfAnySite(t *testing.T) {
	l := builtinLookup(t)
	slabs := l.Model().Slabs()
	drawn := 0
	rapid.Check(t, func(t *rapid.T) {
		cs := slab.Contours(rapid.SampledFrom(slabs).Draw(t, "slab").Surface)
		path := cs[rapid.IntRange(0, len(cs)-1).Draw(t, "contour")].Path
		p := path[rapid.IntRange(0, len(path)-1).Draw(t, "vertex")]
		site := setting.SiteAt(p.Lon+rapid.Float64Range(-1.5, 1.5).Draw(t, "east"), p.Lat+rapid.Float64Range(-1.5, 1.5).Draw(t, "north"))
		if rapid.Bool().Draw(t, "with depth") {
			site.DepthKm = rapid.Float64Range(-10, 800).Draw(t, "depth")
		}
		s, err := l.Section(site)
		if err != nil {
			t.Skip(err.Error())
		}
		drawn++
		checkFigure(t, Section(s))
	})
	if drawn < 50 && !testing.Short() { // rapid draws fewer in short mode
		t.Errorf("only %d figures", drawn)
	}
}

// TestTextIsEscaped: names with marks of XML in them leave the figure well formed.
func TestTextIsEscaped(t *testing.T) {
	l, err := testmodel.New(t).Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	s := sectionOf(t, l, 62, -5, math.NaN())
	was := *s.Slab
	defer func() { *s.Slab = was }()
	s.Slab.Name, s.Slab.Source = `A <b>"slab"</b> & more \x00`, strings.Repeat("</text><script>alert(1)</script>", 9)
	doc := Section(s)
	checkFigure(t, doc)
	if strings.Contains(string(doc), "<script") || strings.Contains(string(doc), "<b>") {
		t.Error("a name's markup is markup in the figure")
	}
	if title := parse(t, doc, "title")[0]; title != "Slab cross-section: "+s.Slab.Name {
		t.Errorf("title %q", title)
	}
}

// TestSlabIsDrawnToScale reads the slab's line back from the figure and compares
// it with the section's depths, by the labels of the axes.
func TestSlabIsDrawnToScale(t *testing.T) {
	s := sectionOf(t, builtinLookup(t), -72.4, -36.1, math.NaN())
	doc := string(Section(s))
	label := func(text, anchor, axis string) float64 {
		m := regexp.MustCompile(`x="([0-9.]+)" y="([0-9.]+)" font-size="12.5" text-anchor="` + anchor + `">` + text + `<`).FindStringSubmatch(doc)
		if m == nil {
			t.Fatalf("no label %q", text)
		}
		v, _ := strconv.ParseFloat(m[map[string]int{"x": 1, "y": 2}[axis]], 64)
		return v
	}
	x0, kx := label("0", "middle", "x"), (label("400", "middle", "x")-label("0", "middle", "x"))/400
	y0, ky := label("0", "end", "y"), (label("150", "end", "y")-label("0", "end", "y"))/150
	if math.Abs(kx-ky) > 0.002 {
		t.Errorf("%g px a km along, %g down: not the true scale that is stated", kx, ky)
	}
	m := regexp.MustCompile(`class="nm-slab0"[^>]* d="([^"]*)"`).FindStringSubmatch(doc)
	if m == nil {
		t.Fatal("no line of the slab")
	}
	n := 0
	for _, pair := range strings.FieldsFunc(m[1], func(r rune) bool { return r == 'M' || r == 'L' }) {
		var x, y float64
		if _, err := fmt.Sscanf(pair, "%f %f", &x, &y); err != nil {
			t.Fatal(err)
		}
		km, depth := (x-x0)/kx, (y-y0+4.4)/ky // labels stand 4.4 px below their tick
		for i, p := range s.Samples {
			if math.Abs(p.Km-km) < 1 && s.Profiles[0].Has(i) {
				n++
				if z := s.Profiles[0].Readings[i].DepthKm; math.Abs(z-depth) > 0.5 {
					t.Errorf("at %g km the slab is drawn at %.1f km depth, want %.1f", p.Km, depth, z)
				}
			}
		}
	}
	if n < 50 {
		t.Errorf("only %d points of the slab were compared", n)
	}
}
