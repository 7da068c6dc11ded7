package builtin_test

import (
	"cmp"
	"encoding/csv"
	"fmt"
	"maps"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// rowsOf reads a CSV file of the reference data into one map a row.
func rowsOf(t *testing.T, name string) []map[string]string {
	t.Helper()
	all, err := csv.NewReader(reference(t, name)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var out []map[string]string
	for _, r := range all[1:] {
		row := map[string]string{}
		for i, h := range all[0] {
			row[h] = r[i]
		}
		out = append(out, row)
	}
	return out
}

func numberIn(t *testing.T, row map[string]string, key string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(row[key], 64)
	if err != nil {
		t.Fatalf("%s: %v", key, err)
	}
	return x
}

// classes are the step classes of Bird (2003), section 3.
var classes = map[string]boundary.Type{
	"SUB": boundary.Subduction, "OSR": boundary.SpreadingRidge, "OTF": boundary.OceanicTransform, "CTF": boundary.ContinentalTransform,
	"CRB": boundary.ContinentalRift, "CCB": boundary.ContinentalConvergent, "OCB": boundary.OceanicConvergent,
}

// referenceSigmaKm stands for the σ of the reference's lines, which give none.
const referenceSigmaKm = 10

// referenceSteps makes one boundary of each row of the table of steps of Bird (2003).
func referenceSteps(t *testing.T) []*boundary.Boundary {
	t.Helper()
	rename := func(code string) string {
		if ours, ok := map[string]string{"AF": "NU", "SO": "SM", "YA": "YZ"}[code]; ok {
			return ours
		}
		return code
	}
	sinking := 0
	var out []*boundary.Boundary
	for _, row := range rowsOf(t, "pb2002/PB2002_steps.csv") {
		pair := strings.Trim(row["PlateBoundIdentifer"], ":*")
		s := boundary.Spec{
			ID: "step-" + row["SeqNum"], Name: pair, SigmaKm: referenceSigmaKm, Left: rename(pair[:2]), Right: rename(pair[3:]),
			Type: classes[strings.Trim(row["StepClass"], ":*")], Source: "Bird (2003), table of steps", SourceStatus: boundary.Consulted,
			Path: []sphere.LonLat{{Lon: numberIn(t, row, "StartLong"), Lat: numberIn(t, row, "StartLat")}, {Lon: numberIn(t, row, "FinalLong"), Lat: numberIn(t, row, "FinalLat")}},
		}
		switch {
		case s.Type != boundary.Subduction:
		case pair[2] == '/':
			s.Subducting = s.Right
		case pair[2] == '\\':
			s.Subducting = s.Left
		}
		b, err := boundary.New(s)
		if err != nil {
			t.Fatal(err)
		}
		if b.Type() == boundary.Subduction {
			sinking++
		}
		out = append(out, b)
	}
	if len(out) != 5819 || sinking < 1000 {
		t.Fatalf("%d steps, %d of subduction; want 5,819 and more than 1,000", len(out), sinking)
	}
	return out
}

// referenceSlabs makes one gridded slab of each zone of the thinned depths of
// Hayes et al. (2018), tied to the subduction steps within 300 km of it.
func referenceSlabs(t *testing.T, steps []*boundary.Boundary) []*slab.Slab {
	t.Helper()
	const degStep = 0.2
	type node struct{ lon, lat, depthKm, sigmaKm float64 }
	zones := map[string][]node{}
	for _, row := range rowsOf(t, "slab2/depth_0p2deg.csv") {
		n := node{numberIn(t, row, "lon"), numberIn(t, row, "lat"), numberIn(t, row, "depth_km"), math.NaN()}
		if row["sigma_km"] != "" {
			n.sigmaKm = numberIn(t, row, "sigma_km")
		}
		if n.lon < 0 {
			n.lon += 360
		}
		zones[row["zone"]] = append(zones[row["zone"]], n)
	}
	var out []*slab.Slab
	for _, zone := range slices.Sorted(maps.Keys(zones)) {
		nodes := zones[zone]
		by := func(f func(node) float64) (lo, hi float64) {
			cmpBy := func(a, b node) int { return cmp.Compare(f(a), f(b)) }
			return f(slices.MinFunc(nodes, cmpBy)), f(slices.MaxFunc(nodes, cmpBy))
		}
		west, east := by(func(n node) float64 { return n.lon })
		south, north := by(func(n node) float64 { return n.lat })
		layer := func(f func(node) float64) *slab.Layer {
			l := &slab.Layer{West: west, South: south, Step: degStep, Cols: int(math.Round((east-west)/degStep)) + 1, Rows: int(math.Round((north-south)/degStep)) + 1}
			l.Values = slices.Repeat([]float32{float32(math.NaN())}, l.Cols*l.Rows)
			for _, n := range nodes {
				l.Values[int(math.Round((n.lat-south)/degStep))*l.Cols+int(math.Round((n.lon-west)/degStep))] = float32(f(n))
			}
			return l
		}
		s := slab.Spec{ID: zone, Name: zone, Kind: slab.Subduction, ArcMinDepthKm: 80, Source: "Hayes et al. (2018), thinned", SourceStatus: "consulted"}
		switch zone { // no subduction step is near these
		case "him", "hin":
			s.Kind, s.Subducting, s.Overriding = slab.Collision, "IN", "EU"
		case "mak":
			s.Subducting, s.Overriding = "AR", "EU"
		}
		var err error
		if s.Surface, err = slab.NewGrid(slab.Layers{Depth: layer(func(n node) float64 { return n.depthKm }), Sigma: layer(func(n node) float64 { return n.sigmaKm })}); err != nil {
			t.Fatal(err)
		}
		vecs := make([]sphere.Vec, len(nodes))
		for i, n := range nodes {
			vecs[i] = sphere.FromLonLat(sphere.LonLat{Lon: n.lon, Lat: n.lat})
		}
		cos := math.Cos(sphere.KmToRad(300))
		for _, b := range steps {
			if b.Type() != boundary.Subduction || s.Kind != slab.Subduction {
				continue
			}
			at := sphere.FromLonLat(b.Path()[0])
			if slices.ContainsFunc(vecs, func(v sphere.Vec) bool { return v.Dot(at) > cos }) {
				s.BoundaryIDs = append(s.BoundaryIDs, b.ID())
				s.Subducting = b.Subducting()
				s.Overriding, _ = b.Opposite(s.Subducting)
			}
		}
		built, err := slab.New(s)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, built)
	}
	return out
}

// referenceModel is the built-in model with other boundaries and slabs.
func referenceModel(t *testing.T) *setting.Model {
	t.Helper()
	m := model(t)
	steps := referenceSteps(t)
	c := setting.Contents{
		ID: "reference", Edition: "1", Plates: m.Plates(), Boundaries: steps, DefaultMotion: m.DefaultMotion(),
		Zones: m.Zones(), Hotspots: m.Hotspots(), Land: m.Land(), Slabs: referenceSlabs(t, steps),
		Motions: []*motion.Model{motionModel(t, m.DefaultMotion())},
	}
	out, err := setting.NewModel(c)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// The labels that the same rules give from the boundaries of Bird (2003) and the
// slabs of Hayes et al. (2018), which lack South America: where the built-in model
// claims high confidence they should hardly differ, where it claims low more often.
func TestLabelsAgainstTheReference(t *testing.T) {
	theirs, ours := lookup(t, referenceModel(t)), lookup(t, model(t))
	var n, differ [4]int
	margins, marginsDiffer := 0, 0 // high, and no plate interior in both
	pairs, where := map[string]int{}, map[string]string{}
	var a, b setting.Answer
	for _, at := range scattered(t, 10_000) {
		s := setting.SiteAt(at.Lon, at.Lat)
		if err := cmp.Or(ours.At(s, &a), theirs.At(s, &b)); err != nil {
			t.Fatal(err)
		}
		n[a.Confidence]++
		if a.Confidence == setting.High && (a.Label != setting.PlateInterior || b.Label != setting.PlateInterior) {
			margins++
		}
		if a.Label == b.Label {
			continue
		}
		differ[a.Confidence]++
		if a.Confidence == setting.High {
			marginsDiffer++
			k := a.Label.String() + " here, " + b.Label.String() + " there"
			if pairs[k]++; pairs[k] <= 4 {
				where[k] += fmt.Sprintf(" %.1f,%.1f", at.Lon, at.Lat)
			}
		}
	}
	share := func(c setting.Confidence) float64 { return float64(differ[c]) / float64(max(1, n[c])) }
	for _, c := range [...]setting.Confidence{setting.High, setting.Medium, setting.Low} {
		t.Logf("%v: %d points, labels differ on %d (%.1f %%)", c, n[c], differ[c], 100*share(c))
	}
	t.Logf("high, and no plate interior in one or both: %d points, labels differ on %d (%.1f %%)", margins, marginsDiffer, 100*float64(marginsDiffer)/float64(max(1, margins)))
	for _, k := range slices.SortedFunc(maps.Keys(pairs), func(x, y string) int { return cmp.Or(cmp.Compare(pairs[y], pairs[x]), cmp.Compare(x, y)) }) {
		if pairs[k] >= 3 {
			t.Logf("%3d %s, such as at%s", pairs[k], k, where[k])
		}
	}
	if share(setting.High) > 0.04 || n[setting.High] < 5000 {
		t.Errorf("labels of high confidence differ on %.1f %% of %d, want at most 4 %%", 100*share(setting.High), n[setting.High])
	}
	if !(share(setting.Low) >= 5*share(setting.High)) || differ[setting.High] == 0 {
		t.Errorf("labels of low confidence differ on %.1f %% and those of high on %.1f %%, want at least five times as often", 100*share(setting.Low), 100*share(setting.High))
	}
}
