package setting_test

import (
	"errors"
	"math"
	"strings"
	"testing"

	"nearmargin/setting"
)

func TestSiteValidate(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	site := func(lon, lat, depthKm, uncertaintyKm, ageMa float64) setting.Site {
		return setting.Site{Lon: lon, Lat: lat, DepthKm: depthKm, UncertaintyKm: uncertaintyKm, AgeMa: ageMa}
	}
	for _, c := range []struct {
		name  string
		site  setting.Site
		field string // "" where the site is good
		want  string
	}{
		{"an ordinary site", setting.SiteAt(-72.4, -36.1), "", ""},
		{"all that may be given", site(10, 20, 33, 5, 100), "", ""},
		{"lowest of everything", site(-180, -90, -10, 0, 0), "", ""},
		{"highest of everything", site(360, 90, 800, 1000, 4600), "", ""},
		{"longitude below", setting.SiteAt(-180.001, 0), "lon", "-180.001 is out of range -180 to 360"},
		{"longitude above", setting.SiteAt(360.001, 0), "lon", "360.001 is out of range -180 to 360"},
		{"longitude missing", setting.SiteAt(nan, 0), "lon", "NaN is not a longitude; give degrees from -180 to 360"},
		{"longitude infinite", setting.SiteAt(inf, 0), "lon", "not a longitude"},
		{"latitude missing", setting.SiteAt(0, nan), "lat", "NaN is not a latitude; give degrees from -90 to 90"},
		{"latitude infinite", setting.SiteAt(0, -inf), "lat", "not a latitude"},
		{"lon and lat swapped, Tokyo", setting.SiteAt(35.7, 139.7), "lat", "139.7 is out of range -90 to 90; are lon and lat swapped?"},
		{"lon and lat swapped, Santiago", setting.SiteAt(-33.4, -100.6), "lat", "are lon and lat swapped?"},
		{"lon and lat swapped, east of Greenwich in 0 to 360", setting.SiteAt(-15, 287), "lat", "are lon and lat swapped?"},
		{"latitude a little above", setting.SiteAt(100, 90.5), "lat", "90.5 is out of range -90 to 90"},
		{"depth too high in the air", site(0, 1, -10.5, nan, nan), "depth_km", "-10.5 is out of range -10 to 800 (km, positive down"},
		{"depth in metres", site(0, 1, 33000, nan, nan), "depth_km", "33000 is out of range"},
		{"depth infinite", site(0, 1, inf, nan, nan), "depth_km", "out of range"},
		{"uncertainty below 0", site(0, 1, nan, -1, nan), "uncertainty_km", "-1 is out of range 0 to 1000 (km, one standard deviation)"},
		{"uncertainty too large", site(0, 1, nan, 1001, nan), "uncertainty_km", "1001 is out of range"},
		{"age below 0", site(0, 1, nan, nan, -1), "age_ma", "-1 is out of range 0 to 4600 (millions of years)"},
		{"age in years", site(0, 1, nan, nan, 2.5e6), "age_ma", "out of range"},
	} {
		err := c.site.Validate()
		if c.field == "" {
			if err != nil {
				t.Errorf("%s: %v", c.name, err)
			}
			continue
		}
		var fe *setting.FieldError
		if !errors.As(err, &fe) || fe.Field != c.field || !strings.Contains(fe.Detail, c.want) {
			t.Errorf("%s: error %v, want one of %s that says %q", c.name, err, c.field, c.want)
			continue
		}
		if swapped := strings.Contains(c.want, "swapped"); !swapped && strings.Contains(fe.Detail, "swapped") {
			t.Errorf("%s: %q asks whether lon and lat are swapped, and they cannot be", c.name, fe.Detail)
		}
		if got := look(t, setting.Options{}).At(c.site, &setting.Answer{}); got == nil || got.Error() != err.Error() {
			t.Errorf("%s: At says %v, want %v", c.name, got, err)
		}
	}
}

func TestSiteAtGivesNothingElse(t *testing.T) {
	s := setting.SiteAt(1, 2)
	if s.Lon != 1 || s.Lat != 2 || !math.IsNaN(s.DepthKm) || !math.IsNaN(s.UncertaintyKm) || !math.IsNaN(s.AgeMa) {
		t.Errorf("%+v, want 1, 2 and nothing else", s)
	}
}

func TestLookupErrorsListTheMotionModels(t *testing.T) {
	for _, c := range []struct {
		o     setting.Options
		field string
	}{
		{setting.Options{Motion: "none"}, "motion"},
		{setting.Options{Fallback: "none"}, "motion_fallback"},
	} {
		l, err := synthetic.Lookup(c.o)
		var fe *setting.FieldError
		if l != nil || !errors.As(err, &fe) || fe.Field != c.field || fe.Detail != `"none" is not a motion model of synthetic@1; there are composed, fast, half, slow` {
			t.Errorf("%+v: %v, %v", c.o, l, err)
		}
	}
	if l := look(t, setting.Options{}); l.Model() != synthetic || answer(t, l, setting.SiteAt(1, 50)).MotionModel != "slow" {
		t.Error("the look-up must answer from its model with the default motion")
	}
}
