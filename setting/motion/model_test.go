package motion_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

func TestNewModelErrors(t *testing.T) {
	basis := func(plate, basis string) motion.Entry {
		return motion.Entry{Plate: plate, Vector: sphere.Vec{X: 0.01}, Basis: basis}
	}
	good := basis("AA", motion.Published)
	for _, c := range []struct {
		name    string
		model   string
		entries []motion.Entry
		want    string
	}{
		{"no name", "", []motion.Entry{good}, "name is empty"},
		{"a plate twice", "m", []motion.Entry{good, basis("BB", motion.Published), good}, `plate "AA" stands twice`},
		{"faster than any plate", "m", []motion.Entry{entry("AA", sphere.Vec{Y: 5})}, `plate "AA" turns at 5 rad/Myr`},
		{"no number", "m", []motion.Entry{entry("AA", sphere.Vec{Y: math.NaN()})}, `plate "AA" turns at NaN`},
		{"infinite", "m", []motion.Entry{entry("AA", sphere.Vec{Y: math.Inf(-1)})}, `plate "AA" turns at +Inf`},
		{"no basis", "m", []motion.Entry{basis("AA", "")}, `basis "" must be "published" or "composed:" and a plate's code`},
		{"unknown basis", "m", []motion.Entry{basis("AA", "guessed")}, `basis "guessed" must be`},
		{"anchor missing", "m", []motion.Entry{good, basis("BB", motion.Composed("CC"))}, `plate "BB" is composed on "CC", which is not a published plate`},
		{"anchor itself composed", "m", []motion.Entry{good, basis("BB", motion.Composed("AA")), basis("CC", motion.Composed("BB"))}, `plate "CC" is composed on "BB"`},
		{"anchored on itself", "m", []motion.Entry{basis("BB", motion.Composed("BB"))}, `plate "BB" is composed on "BB"`},
	} {
		m, err := motion.NewModel(motion.Info{Name: c.model}, c.entries)
		if err == nil || m != nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: model %v, error %v; want an error that says %q", c.name, m, err, c.want)
		}
		if err != nil && c.model != "" && !strings.Contains(err.Error(), `motion model "`+c.model+`"`) {
			t.Errorf("%s: error %q does not name the model", c.name, err)
		}
	}
}

func TestModelTellsWhatItHolds(t *testing.T) {
	composed := motion.Entry{Plate: "BB", Vector: sphere.Vec{X: 0.02}, Basis: motion.Composed("CC")}
	in := []motion.Entry{entry("CC", sphere.Vec{X: 0.01}), composed, entry("AA", sphere.Vec{})}
	info := motion.Info{Name: "test", Title: "A title", Frame: "a frame", TimeSpan: "a span", Citation: "a citation", RelativeTo: "AA"}
	m, err := motion.NewModel(info, in)
	if err != nil {
		t.Fatal(err)
	}
	if m.Info() != info || m.Name() != "test" {
		t.Errorf("info %+v and name %q, want %+v", m.Info(), m.Name(), info)
	}
	in[0].Plate = "XX" // the model keeps its own copy
	got := m.Entries()
	var plates []string
	for i := range got {
		plates = append(plates, got[i].Plate)
	}
	if !slices.Equal(plates, []string{"AA", "BB", "CC"}) {
		t.Errorf("plates %v, want them sorted", plates)
	}
	got[0].Plate = "XX"
	if m.Entries()[0].Plate != "AA" {
		t.Error("a change of the returned slice reached the model")
	}
	for _, c := range []struct {
		plate  string
		has    bool
		basis  string
		anchor string
	}{{"AA", true, "published", ""}, {"BB", true, "composed:CC", "CC"}, {"CC", true, "published", ""}, {"DD", false, "", ""}, {"", false, "", ""}} {
		if m.Has(c.plate) != c.has || m.Basis(c.plate) != c.basis {
			t.Errorf("plate %q: has %v, basis %q; want %v, %q", c.plate, m.Has(c.plate), m.Basis(c.plate), c.has, c.basis)
		}
		if i := slices.IndexFunc(m.Entries(), func(e motion.Entry) bool { return e.Plate == c.plate }); i >= 0 {
			if e := m.Entries()[i]; e.Anchor() != c.anchor {
				t.Errorf("plate %q: anchor %q, want %q", c.plate, e.Anchor(), c.anchor)
			}
		}
	}
}
