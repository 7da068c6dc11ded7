package testmodel

import (
	"testing"

	"nearmargin/setting"
)

// TestModelMeetsEveryLabel proves that the made-up globe is closed and gives the
// tests every label that distance rules can give.
func TestModelMeetsEveryLabel(t *testing.T) {
	m := New(t)
	for _, f := range m.Network().Faults() {
		t.Errorf("the network has a fault at %v: %s", f.At, f.Detail)
	}
	met := map[setting.Label]bool{}
	for lat := -85.0; lat <= 85; lat += 2.5 {
		for lon := -180.0; lon < 180; lon += 0.4 {
			a, err := m.At(setting.SiteAt(lon, lat))
			if err != nil {
				t.Fatal(err)
			}
			met[a.Label] = true
		}
	}
	for _, l := range setting.AllLabels {
		if l != setting.BackArcSpreading && !met[l] {
			t.Errorf("no site has the label %v", l)
		}
	}
}
