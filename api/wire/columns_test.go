package wire

import (
	"encoding/json"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
)

// inAnswer says where in the Answer's JSON the value of a column stands.
var inAnswer = map[string]string{
	"plate": "plate.code", "side_uncertain": "plate.side_uncertain",
	"setting": "setting.label", "family": "setting.family", "confidence": "setting.confidence", "reason": "setting.reasons.0",
	"boundary_id": "nearest_boundary.id", "boundary_type": "nearest_boundary.type",
	"distance_km": "nearest_boundary.distance_km", "distance_sigma_km": "nearest_boundary.distance_sigma_km", "azimuth_deg": "nearest_boundary.azimuth_deg",
	"rate_mm_yr": "nearest_boundary.relative_motion.rate_mm_yr", "rate_sigma_mm_yr": "nearest_boundary.relative_motion.rate_sigma_mm_yr",
	"rate_azimuth_deg": "nearest_boundary.relative_motion.azimuth_deg", "opening_mm_yr": "nearest_boundary.relative_motion.opening_mm_yr",
	"shear_mm_yr": "nearest_boundary.relative_motion.shear_mm_yr", "obliquity_deg": "nearest_boundary.relative_motion.obliquity_deg",
	"motion_model": "nearest_boundary.relative_motion.motion_model",
	"control_id":   "controlling_boundary.id", "control_type": "controlling_boundary.type", "control_distance_km": "controlling_boundary.distance_km",
	"slab": "slabs.0.slab", "slab_depth_km": "slabs.0.depth_km", "slab_sigma_km": "slabs.0.sigma_km", "slab_dip_deg": "slabs.0.dip_deg",
	"site_relation": "slabs.0.site_relation", "clearance_km": "slabs.0.clearance_km",
	"diffuse_zone": "diffuse_zone.name", "hotspot": "hotspot.name",
}

// text returns the value at a path of decoded JSON as a table shows it, "" for
// null and for what is not there.
func text(v any, path string) string {
	for key := range strings.SplitSeq(path, ".") {
		switch x := v.(type) {
		case map[string]any:
			v = x[key]
		case []any:
			i, err := strconv.Atoi(key)
			if err != nil || i >= len(x) {
				return ""
			}
			v = x[i]
		default:
			return ""
		}
	}
	switch x := v.(type) {
	case string:
		return x
	case json.Number:
		return x.String()
	case bool:
		return strconv.FormatBool(x)
	}
	return ""
}

// TestCellsGiveTheNumbersOfTheAnswer: given random sites, expect in every column
// what stands in the JSON, character by character.
func TestCellsGiveTheNumbersOfTheAnswer(t *testing.T) {
	ask := lookups(t)
	var c Cells // used again for each site, as a table does
	rapid.Check(t, func(t *rapid.T) {
		var a setting.Answer
		if err := rapid.SampledFrom(ask).Draw(t, "lookup").At(drawSite(t), &a); err != nil {
			t.Fatal(err)
		}
		if rapid.Bool().Draw(t, "after an error") {
			c.SetError("a reason that is longer than most values")
		}
		c.Set(&a)
		v := decode(t, AppendAnswer(nil, &a))
		for i, name := range Columns {
			got, want := string(c.Value(i)), text(v, inAnswer[name])
			switch name {
			case "model":
				want = text(v, "model.id") + "@" + text(v, "model.edition")
			case "notes":
				var codes []string
				for _, n := range a.Notes.All() {
					codes = append(codes, string(n.Code))
				}
				want = strings.Join(codes, ";")
			case "error":
				want = ""
			default:
				if inAnswer[name] == "" {
					t.Fatalf("column %s has no place in the answer", name)
				}
			}
			if got != want {
				t.Fatalf("column %s holds %q, the answer %q", name, got, want)
			}
		}
	})
}

// TestSetError: all columns are empty but the last.
func TestSetError(t *testing.T) {
	var a setting.Answer
	if err := lookups(t)[0].At(setting.SiteAt(61, 5), &a); err != nil {
		t.Fatal(err)
	}
	var c Cells
	c.Set(&a)
	c.SetError("lat: is missing")
	for i := range NumColumns - 1 {
		if len(c.Value(i)) > 0 {
			t.Errorf("column %s holds %q", Columns[i], c.Value(i))
		}
	}
	if got := string(c.Value(NumColumns - 1)); got != "lat: is missing" || Columns[NumColumns-1] != "error" {
		t.Errorf("column %s holds %q", Columns[NumColumns-1], got)
	}
}

// TestSetAllocatesNothing: a million rows must not make a million pieces of garbage.
func TestSetAllocatesNothing(t *testing.T) {
	l := lookups(t)[3]
	var answers [4]setting.Answer
	for i, s := range []setting.Site{setting.SiteAt(61, 5), setting.SiteAt(-90, 20), setting.SiteAt(0, 0), setting.SiteAt(30, 0)} {
		if err := l.At(s, &answers[i]); err != nil {
			t.Fatal(err)
		}
	}
	var c Cells
	i := 0
	for range answers { // the buffer grows to its size
		c.Set(&answers[i%len(answers)])
		i++
	}
	if n := testing.AllocsPerRun(1000, func() { c.Set(&answers[i%len(answers)]); i++ }); n != 0 {
		t.Errorf("Set allocates %g times", n)
	}
	buf := make([]byte, 0, 1<<16)
	buf = AppendBoundaries(buf[:0], nil)
	if string(buf) != "{\"type\":\"FeatureCollection\",\"features\":[\n]}\n" {
		t.Errorf("no boundaries: %q", buf)
	}
}

// TestAppendBoundaries: given the made-up network, expect one feature a boundary,
// with its fields and every vertex.
func TestAppendBoundaries(t *testing.T) {
	list := lookups(t)[0].Model().Network().Boundaries()
	v := decode(t, AppendBoundaries(nil, list))
	features := v.(map[string]any)["features"].([]any)
	if len(features) != len(list) {
		t.Fatalf("%d features, want %d", len(features), len(list))
	}
	cut := 0
	for i, f := range features {
		b := list[i]
		c := checker{t, b.ID()}
		m := c.object(f, "type", "id", "properties", "geometry")
		c.equal("id", m["id"], b.ID())
		p := c.object(m["properties"], "id", "name", "type", "left_plate", "right_plate", "subducting_plate", "sigma_km", "length_km", "source", "source_status")
		c.equal("type", p["type"], b.Type().String())
		c.equal("left_plate", p["left_plate"], b.Left())
		c.equal("right_plate", p["right_plate"], b.Right())
		c.equal("subducting_plate", p["subducting_plate"], orNil(b.Subducting()))
		c.number("sigma_km", p["sigma_km"], b.SigmaKm(), 1)
		c.number("length_km", p["length_km"], b.LengthKm(), 1)
		c.equal("source_status", p["source_status"], string(b.SourceStatus()))
		g := c.object(m["geometry"], "type", "coordinates")
		lines := g["coordinates"].([]any)
		if g["type"] == "LineString" {
			lines = []any{lines}
		} else {
			cut++
		}
		checkParts(c, lines, b)
	}
	if cut == 0 {
		t.Error("no line was cut at ±180°")
	}
	if !slices.ContainsFunc(list, func(b *boundary.Boundary) bool { return b.Subducting() == "" }) {
		t.Error("no boundary was without a subducting plate")
	}
}

func checkParts(c checker, lines []any, b *boundary.Boundary) {
	parts := b.Parts()
	c.equal("parts", len(lines), len(parts))
	for i, line := range lines {
		points := line.([]any)
		c.equal("vertices", len(points), len(parts[i]))
		for j, p := range points {
			p := p.([]any)
			c.number("longitude", p[0], parts[i][j].Lon, 6)
			c.number("latitude", p[1], parts[i][j].Lat, 6)
		}
	}
}
