package builtin_test

import "testing"

func TestZZProbe(t *testing.T) {
	for _, c := range []struct {
		n        string
		lon, lat float64
	}{
		{"JFAST", 143.91, 37.94}, {"Fuji", 138.73, 35.36}, {"Tokyo", 139.75, 35.68}, {"Kilauea", -155.28, 19.41}, {"White", 177.18, -37.52},
		{"Etna", 15.0, 37.75}, {"Yellowstone", -110.6, 44.45}, {"Haiti", -72.3, 18.55}, {"Timor", 125.0, -9.0}, {"Mendocino", -124.4, 40.44}, {"Lima", -77.04, -12.05},
		{"Muscat", 58.4, 23.6}, {"SLC", -111.9, 40.76}, {"Davao", 125.6, 7.07}, {"Taftan", 61.13, 28.60}, {"Vladivostok", 131.9, 43.1},{"Kaikoura", 173.7,-42.4},{"Hindu Kush", 70.8, 36.5},
	} {
		a := answerAt(t, c.lon, c.lat)
		t.Log(c.n, "plate", a.Plate.Code, "uncertain", a.SideUncertain, told(a))
		t.Log("    nearest", a.Nearest.Boundary.Name(), a.Nearest.Boundary.Type(), a.Nearest.DistanceKm, "zone", a.Zone != nil, "hotspot", a.Hotspot != nil)
		if a.IsControlled {
			t.Log("    control", a.Controlling.Boundary.ID(), a.Controlling.Boundary.Name(), a.Controlling.Boundary.Subducting(), a.Controlling.DistanceKm)
		}
		for _, s := range a.Slabs.All() {
			t.Log("    slab", s.Slab.ID, s.DepthKm)
		}
	}
}
