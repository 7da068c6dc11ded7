package wire

import (
	"encoding/json"
	"math"
	"testing"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
)

// sectionJSON is the JSON of a section as a reader in another language sees it.
type sectionJSON struct {
	SiteDistance float64 `json:"site_distance_km"`
	Slab         struct{ Slab, Kind, Source string }
	Below        *struct {
		Slab  string
		Depth float64 `json:"depth_km"`
	} `json:"slab_below_site"`
	Outside float64 `json:"outside_slab_km"`
	Line    struct {
		Azimuth float64 `json:"azimuth_deg"`
		From    string  `json:"azimuth_from"`
		FromKm  float64 `json:"from_km"`
		ToKm    float64 `json:"to_km"`
		StepKm  float64 `json:"step_km"`
	}
	Trench *struct {
		ID          string
		Convergence *float64 `json:"convergence_mm_yr"`
		Motion      *struct {
			Opening float64 `json:"opening_mm_yr"`
		} `json:"relative_motion"`
	}
	Arc *struct {
		Ranges []struct {
			From float64 `json:"from_km"`
			To   float64 `json:"to_km"`
		}
	} `json:"arc_band"`
	Samples []struct {
		Km       float64 `json:"distance_km"`
		Lon, Lat float64
		Depth    *float64 `json:"depth_km"`
		Sigma    *float64 `json:"sigma_km"`
		Dip      *float64 `json:"dip_deg"`
	}
	Notes []struct{ Code string }
}

// TestAppendSection compares what is written with the section, number by number.
func TestAppendSection(t *testing.T) {
	m := testmodel.New(t)
	for _, c := range []struct {
		name, motion  string
		lon           float64
		below, moving bool
	}{
		{"above the slab", testmodel.Full, 62.2, true, true},
		{"past its rim", testmodel.Full, 67.3, false, true},
		{"without motion", testmodel.Partial, 62.2, true, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			l, err := m.Lookup(setting.Options{Motion: c.motion})
			if err != nil {
				t.Fatal(err)
			}
			s, err := l.Section(setting.SiteAt(c.lon, -5))
			if err != nil {
				t.Fatal(err)
			}
			var got sectionJSON
			if err := json.Unmarshal(AppendSection(nil, s), &got); err != nil {
				t.Fatal(err)
			}
			near := func(what string, got, want, within float64) {
				t.Helper()
				if math.Abs(got-want) > within {
					t.Errorf("%s is %g, want %g", what, got, want)
				}
			}
			near("site_distance_km", got.SiteDistance, s.SiteKm, 0.005)
			near("outside_slab_km", got.Outside, s.OutsideKm, 0.005)
			near("azimuth_deg", got.Line.Azimuth, s.Line.AzimuthDeg, 0.05)
			if got.Slab.Slab != "east" || got.Slab.Kind != "subduction" || got.Slab.Source != "made up" || got.Line.From != "dip" {
				t.Errorf("slab %+v, line %+v", got.Slab, got.Line)
			}
			if (got.Below != nil) != c.below {
				t.Errorf("slab_below_site is %+v", got.Below)
			} else if c.below {
				near("depth below the site", got.Below.Depth, s.Below.DepthKm, 0.05)
			}
			if got.Trench == nil || got.Trench.ID != "east-subduction" || (got.Trench.Motion != nil) != c.moving || (got.Trench.Convergence != nil) != c.moving {
				t.Fatalf("trench %+v", got.Trench)
			}
			if c.moving {
				near("convergence", *got.Trench.Convergence, -got.Trench.Motion.Opening, 0)
			}
			if got.Arc == nil || len(got.Arc.Ranges) != 1 {
				t.Fatalf("arc_band %+v", got.Arc)
			}
			near("arc from", got.Arc.Ranges[0].From, s.Arc.Ranges[0].FromKm, 0.05)
			near("arc to", got.Arc.Ranges[0].To, s.Arc.Ranges[0].ToKm, 0.05)
			if len(got.Samples) != len(s.Samples) || float64(len(got.Samples)-1)*got.Line.StepKm != got.Line.ToKm-got.Line.FromKm {
				t.Fatalf("%d samples from %g to %g km", len(got.Samples), got.Line.FromKm, got.Line.ToKm)
			}
			for i, x := range got.Samples {
				r := &s.Profiles[0].Readings[i]
				near("distance", x.Km, s.Samples[i].Km, 0)
				near("longitude", x.Lon, s.Samples[i].At.Lon, 5e-7)
				near("latitude", x.Lat, s.Samples[i].At.Lat, 5e-7)
				if has := s.Profiles[0].Has(i); (x.Depth != nil) != has || (x.Sigma != nil) != has || (x.Dip != nil) != has {
					t.Errorf("at %g km: %+v", x.Km, x)
				} else if has {
					near("depth", *x.Depth, r.DepthKm, 0.05)
					near("sigma", *x.Sigma, r.SigmaKm, 0.05)
					near("dip", *x.Dip, r.DipDeg, 0.05)
				}
			}
			if len(got.Notes) != s.Notes.Len() || got.Notes[len(got.Notes)-1].Code != "screening_aid" {
				t.Errorf("notes %+v", got.Notes)
			}
		})
	}
}
