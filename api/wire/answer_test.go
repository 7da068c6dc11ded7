package wire

import (
	"bytes"
	"encoding/json"
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
	"nearmargin/setting/slab"
)

// drawSite draws a site anywhere, often on a line, a pole or ±180°, with and
// without depth, uncertainty and age.
func drawSite(t *rapid.T) setting.Site {
	optional := func(name string, lo, hi float64) float64 {
		if rapid.Bool().Draw(t, name+" given") {
			return rapid.Float64Range(lo, hi).Draw(t, name)
		}
		return math.NaN()
	}
	return setting.Site{
		Lon:           rapid.OneOf(rapid.Float64Range(-180, 360), rapid.SampledFrom([]float64{-180, -179.9999999, 0, 60, 61, 62.5, 179.9999999, 180, 240, 360})).Draw(t, "lon"),
		Lat:           rapid.OneOf(rapid.Float64Range(-90, 90), rapid.SampledFrom([]float64{-90, -89.9999999, -5, 0, 5, 89.99999999, 90})).Draw(t, "lat"),
		DepthKm:       optional("depth_km", -10, 800),
		UncertaintyKm: optional("uncertainty_km", 0, 1000),
		AgeMa:         optional("age_ma", 0, 4600),
	}
}

// lookups are ways to ask the made-up model.
func lookups(tb testing.TB) []*setting.Lookup {
	tb.Helper()
	m := testmodel.New(tb)
	var out []*setting.Lookup
	for _, o := range []setting.Options{{}, {Motion: testmodel.Partial}, {Motion: testmodel.Partial, Fallback: testmodel.Full}, {Brief: true}} {
		l, err := m.Lookup(o)
		if err != nil {
			tb.Fatal(err)
		}
		out = append(out, l)
	}
	return out
}

// decode reads JSON strictly: one value, no member twice, numbers as they stand.
func decode(t require, b []byte) any {
	d := json.NewDecoder(bytes.NewReader(b))
	d.UseNumber()
	v, err := decodeValue(d)
	if err != nil {
		t.Fatalf("%v in %s", err, b)
	}
	if _, err := d.Token(); err == nil {
		t.Fatalf("something follows in %s", b)
	}
	return v
}

// require is what rapid's and the testing package's T share.
type require interface {
	Fatalf(format string, args ...any)
}

func decodeValue(d *json.Decoder) (any, error) {
	tok, err := d.Token()
	if err != nil {
		return nil, err
	}
	switch tok {
	case json.Delim('{'):
		m := map[string]any{}
		for d.More() {
			key, err := d.Token()
			if err != nil {
				return nil, err
			}
			k := key.(string)
			if _, twice := m[k]; twice {
				return nil, &json.SyntaxError{Offset: d.InputOffset()}
			}
			if m[k], err = decodeValue(d); err != nil {
				return nil, err
			}
		}
		_, err = d.Token()
		return m, err
	case json.Delim('['):
		list := []any{}
		for d.More() {
			v, err := decodeValue(d)
			if err != nil {
				return nil, err
			}
			list = append(list, v)
		}
		_, err = d.Token()
		return list, err
	}
	return tok, nil
}

// checker compares decoded JSON with an Answer's fields.
type checker struct {
	t    require
	what string
}

func (c checker) object(v any, keys ...string) map[string]any {
	m, ok := v.(map[string]any)
	if !ok || len(m) != len(keys) {
		c.t.Fatalf("%s: %v, want an object of %v", c.what, v, keys)
	}
	for _, k := range keys {
		if _, ok := m[k]; !ok {
			c.t.Fatalf("%s: %v lacks %s", c.what, m, k)
		}
	}
	return m
}

func (c checker) equal(key string, got, want any) {
	if got != want {
		c.t.Fatalf("%s: %s is %v, want %v", c.what, key, got, want)
	}
}

// number wants a value rounded to so many decimals, and null for NaN.
func (c checker) number(key string, got any, want float64, decimals int) {
	if math.IsNaN(want) {
		c.equal(key, got, nil)
		return
	}
	n, ok := got.(json.Number)
	if !ok {
		c.t.Fatalf("%s: %s is %v, want %g", c.what, key, got, want)
	}
	x, err := n.Float64()
	if err != nil || math.Abs(x-want) > 0.5000001*math.Pow10(-decimals) {
		c.t.Fatalf("%s: %s is %s, want %g to %d decimals", c.what, key, n, want, decimals)
	}
	if _, frac, _ := strings.Cut(n.String(), "."); len(frac) > decimals || strings.HasSuffix(frac, "0") || strings.ContainsAny(n.String(), "eE") || n.String() == "-0" {
		c.t.Fatalf("%s: %s is spelt %s", c.what, key, n)
	}
}

// angle wants an azimuth below a limit: what rounds up to the limit is 0.
func (c checker) angle(key string, got any, want, below float64) {
	if math.Round(want*10)/10 >= below {
		want = 0
	}
	c.number(key, got, want, 1)
}

// position wants [lon, lat] with the longitude within (-180, 180].
func (c checker) position(key string, got any, lon, lat float64, decimals int) {
	p, ok := got.([]any)
	if !ok || len(p) != 2 {
		c.t.Fatalf("%s: %s is %v", c.what, key, got)
	}
	c.longitude(key, p[0], lon, decimals)
	c.number(key, p[1], lat, decimals)
}

func (c checker) longitude(key string, got any, lon float64, decimals int) {
	if x := math.Round(lon*math.Pow10(decimals)) / math.Pow10(decimals); x <= -180 {
		lon = 180
	}
	c.number(key, got, lon, decimals)
}

func (c checker) boundary(v any, x *setting.BoundaryAnswer) {
	m := c.object(v, "id", "name", "type", "distance_km", "distance_sigma_km", "azimuth_deg", "nearest_point", "boundary_azimuth_deg",
		"left_plate", "right_plate", "subducting_plate", "relative_motion")
	c.equal("id", m["id"], x.Boundary.ID())
	c.equal("name", m["name"], x.Boundary.Name())
	c.equal("type", m["type"], x.Boundary.Type().String())
	c.number("distance_km", m["distance_km"], x.DistanceKm, 2)
	c.number("distance_sigma_km", m["distance_sigma_km"], x.SigmaKm, 1)
	c.angle("azimuth_deg", m["azimuth_deg"], x.AzimuthDeg, 360)
	c.position("nearest_point", m["nearest_point"], x.Nearest.Lon, x.Nearest.Lat, 4)
	c.angle("boundary_azimuth_deg", m["boundary_azimuth_deg"], x.BoundaryAzimuthDeg(), 180)
	c.equal("left_plate", m["left_plate"], x.Boundary.Left())
	c.equal("right_plate", m["right_plate"], x.Boundary.Right())
	c.equal("subducting_plate", m["subducting_plate"], orNil(x.Boundary.Subducting()))
	if !x.Motion.Known {
		c.equal("relative_motion", m["relative_motion"], nil)
		return
	}
	v = m["relative_motion"]
	m = c.object(v, "plate", "relative_to", "rate_mm_yr", "rate_sigma_mm_yr", "azimuth_deg", "azimuth_sigma_deg", "opening_mm_yr", "shear_mm_yr", "obliquity_deg", "motion_model")
	c.equal("plate", m["plate"], x.Motion.Plate)
	c.equal("relative_to", m["relative_to"], x.Motion.RelativeTo)
	c.number("rate_mm_yr", m["rate_mm_yr"], x.Motion.RateMmYr, 2)
	c.number("rate_sigma_mm_yr", m["rate_sigma_mm_yr"], x.Motion.RateSigmaMmYr, 2)
	c.angle("azimuth_deg", m["azimuth_deg"], x.Motion.AzimuthDeg, 360)
	c.number("azimuth_sigma_deg", m["azimuth_sigma_deg"], x.Motion.AzimuthSigmaDeg, 1)
	c.number("opening_mm_yr", m["opening_mm_yr"], x.Motion.OpeningMmYr, 2)
	c.number("shear_mm_yr", m["shear_mm_yr"], x.Motion.ShearMmYr, 2)
	c.number("obliquity_deg", m["obliquity_deg"], x.Motion.ObliquityDeg, 1)
	c.equal("motion_model", m["motion_model"], x.Motion.Model)
}

func orNil(s string) any {
	if s == "" {
		return nil
	}
	return s
}

// answer compares the whole.
func (c checker) answer(v any, a *setting.Answer) {
	top := c.object(v, "site", "plate", "setting", "nearest_boundary", "controlling_boundary", "nearby_boundaries", "slabs",
		"triple_junction", "diffuse_zone", "hotspot", "model", "notes")
	m := c.object(top["site"], "lon", "lat", "depth_km", "uncertainty_km")
	c.longitude("lon", m["lon"], a.Site.Lon, 6)
	c.number("lat", m["lat"], a.Site.Lat, 6)
	c.number("depth_km", m["depth_km"], a.Site.DepthKm, 3)
	c.number("uncertainty_km", m["uncertainty_km"], a.Site.UncertaintyKm, 3)
	m = c.object(top["plate"], "code", "name", "side_uncertain")
	c.equal("code", m["code"], a.Plate.Code)
	c.equal("name", m["name"], a.Plate.Name)
	c.equal("side_uncertain", m["side_uncertain"], a.SideUncertain)
	m = c.object(top["setting"], "label", "family", "confidence", "reasons", "alternatives")
	c.equal("label", m["label"], a.Label.String())
	c.equal("family", m["family"], a.Family.String())
	c.equal("confidence", m["confidence"], a.Confidence.String())
	reasons, alternatives := m["reasons"].([]any), m["alternatives"].([]any)
	c.equal("reasons", len(reasons), a.Reasons.Len())
	for i := range reasons {
		c.equal("reason", reasons[i], a.Reasons.All()[i].Text())
	}
	c.equal("alternatives", len(alternatives), a.Alternatives.Len())
	for i := range alternatives {
		alt := a.Alternatives.All()[i]
		m := c.object(alternatives[i], "label", "family", "reason")
		c.equal("label", m["label"], alt.Label.String())
		c.equal("family", m["family"], alt.Family.String())
		c.equal("reason", m["reason"], alt.Text())
	}
	c.boundary(top["nearest_boundary"], &a.Nearest)
	if a.IsControlled {
		c.boundary(top["controlling_boundary"], &a.Controlling)
	} else {
		c.equal("controlling_boundary", top["controlling_boundary"], nil)
	}
	nearby := top["nearby_boundaries"].([]any)
	c.equal("nearby_boundaries", len(nearby), a.Nearby.Len())
	for i, n := range a.Nearby.All() {
		m := c.object(nearby[i], "id", "name", "type", "distance_km", "azimuth_deg")
		c.equal("id", m["id"], n.Boundary.ID())
		c.equal("type", m["type"], n.Boundary.Type().String())
		c.number("distance_km", m["distance_km"], n.DistanceKm, 2)
		c.angle("azimuth_deg", m["azimuth_deg"], n.AzimuthDeg, 360)
	}
	slabs := top["slabs"].([]any)
	c.equal("slabs", len(slabs), a.Slabs.Len())
	for i := range slabs {
		c.slab(slabs[i], &a.Slabs.All()[i])
	}
	c.rest(top, a)
}

func (c checker) slab(v any, x *setting.SlabAnswer) {
	m := c.object(v, "slab", "name", "kind", "depth_km", "sigma_km", "dip_deg", "dip_azimuth_deg", "site_relation", "clearance_km", "distance_3d_km")
	c.equal("slab", m["slab"], x.Slab.ID)
	c.equal("name", m["name"], x.Slab.Name)
	c.equal("kind", m["kind"], x.Slab.Kind.String())
	c.number("depth_km", m["depth_km"], x.DepthKm, 1)
	c.number("sigma_km", m["sigma_km"], x.SigmaKm, 1)
	c.number("dip_deg", m["dip_deg"], x.DipDeg, 1)
	c.angle("dip_azimuth_deg", m["dip_azimuth_deg"], x.DipAzimuthDeg, 360)
	if x.Relation == slab.NoRelation {
		c.equal("site_relation", m["site_relation"], nil)
	} else {
		c.equal("site_relation", m["site_relation"], x.Relation.String())
	}
	c.number("clearance_km", m["clearance_km"], x.ClearanceKm, 1)
	c.number("distance_3d_km", m["distance_3d_km"], x.Distance3DKm, 1)
}

func (c checker) rest(top map[string]any, a *setting.Answer) {
	if a.NearJunction {
		m := c.object(top["triple_junction"], "name", "plates", "distance_km")
		c.equal("name", m["name"], a.Junction.Junction.Name)
		plates := m["plates"].([]any)
		c.equal("plates", len(plates), len(a.Junction.Junction.Plates))
		for i := range plates {
			c.equal("plate", plates[i], a.Junction.Junction.Plates[i])
		}
		c.number("distance_km", m["distance_km"], a.Junction.DistanceKm, 2)
	} else {
		c.equal("triple_junction", top["triple_junction"], nil)
	}
	if a.Zone != nil {
		m := c.object(top["diffuse_zone"], "name", "kind")
		c.equal("name", m["name"], a.Zone.Name)
		c.equal("kind", m["kind"], a.Zone.Kind.String())
	} else {
		c.equal("diffuse_zone", top["diffuse_zone"], nil)
	}
	if a.Hotspot != nil {
		m := c.object(top["hotspot"], "name", "distance_km")
		c.equal("name", m["name"], a.Hotspot.Name)
		c.number("distance_km", m["distance_km"], a.HotspotKm, 2)
	} else {
		c.equal("hotspot", top["hotspot"], nil)
	}
	m := c.object(top["model"], "id", "edition", "sha256")
	c.equal("model", m["id"].(string)+"@"+m["edition"].(string), a.Model.Ref())
	c.equal("sha256", m["sha256"], a.Model.SHA256())
	notes := top["notes"].([]any)
	c.equal("notes", len(notes), a.Notes.Len())
	for i := range notes {
		n := a.Notes.All()[i]
		m := c.object(notes[i], "code", "detail")
		c.equal("code", m["code"], string(n.Code))
		c.equal("detail", m["detail"], n.Text())
	}
}

// TestAppendAnswer: given random sites, when the answer is encoded by hand and
// decoded by encoding/json, expect every field of the Answer, rounded as the
// package says, and nothing else.
func TestAppendAnswer(t *testing.T) {
	ask := lookups(t)
	rapid.Check(t, func(t *rapid.T) {
		site := drawSite(t)
		var a setting.Answer
		if err := rapid.SampledFrom(ask).Draw(t, "lookup").At(site, &a); err != nil {
			t.Fatal(err)
		}
		b := AppendAnswer([]byte("before "), &a)
		if !bytes.HasPrefix(b, []byte("before ")) {
			t.Fatalf("what stood before is gone: %.20s", b)
		}
		b = b[len("before "):]
		checker{t, strconv.FormatFloat(site.Lon, 'g', -1, 64) + " " + strconv.FormatFloat(site.Lat, 'g', -1, 64)}.answer(decode(t, b), &a)
	})
}
