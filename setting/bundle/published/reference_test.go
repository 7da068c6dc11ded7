package published_test

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
	"nearmargin/setting/bundle/published"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// reference returns the folder of reference data; the test skips where there is
// none.
func reference(tb testing.TB) string {
	tb.Helper()
	dir, err := os.Getwd()
	if err != nil {
		tb.Fatal(err)
	}
	for ; ; dir = filepath.Dir(dir) {
		if _, err := os.Stat(filepath.Join(dir, "go.mod")); err == nil {
			break
		}
		if dir == filepath.Dir(dir) {
			tb.Fatal("no go.mod above the test")
		}
	}
	dir = filepath.Join(dir, "..", "shared", "reference")
	if _, err := os.Stat(dir); errors.Is(err, fs.ErrNotExist) {
		tb.Skipf("reference data are absent: %v", err)
	}
	return dir
}

func fileAt(path string) *published.File {
	return &published.File{Name: path, Open: func() (io.ReadCloser, error) { return os.Open(path) }}
}

// fromReference builds a model of everything below the folder of reference data:
// Bird (2003) and the slabs of Hayes et al. (2018) that are there in full, the rest
// from the built-in model.
func fromReference(tb testing.TB) (*bundle.Bundle, *published.Report) {
	tb.Helper()
	dir := reference(tb)
	base, err := builtin.Load()
	if err != nil {
		tb.Fatal(err)
	}
	q := published.Request{
		Base: base, Identity: bundle.Identity{ID: "published", Edition: "test"}, Codes: published.BirdCodes(),
		Steps:   fileAt(filepath.Join(dir, "pb2002", "PB2002_steps.dat.txt")),
		Plates:  fileAt(filepath.Join(dir, "pb2002", "PB2002_plates.dig.txt")),
		Orogens: fileAt(filepath.Join(dir, "pb2002", "PB2002_orogens.dig.txt")),
		Poles:   fileAt(filepath.Join(dir, "pb2002", "PB2002_poles.dat.txt")),
	}
	grids, err := filepath.Glob(filepath.Join(dir, "slab2", "*.xyz.gz"))
	if err != nil || len(grids) == 0 {
		tb.Fatalf("%v, %d grids", err, len(grids))
	}
	for _, g := range grids {
		q.Slab2 = append(q.Slab2, *fileAt(g))
	}
	b, r, err := published.Build(q)
	if err != nil {
		tb.Fatal(err)
	}
	return b, r
}

var (
	importOnce   sync.Once
	imported     *bundle.Bundle
	importReport *published.Report
)

func importedModel(tb testing.TB) (*bundle.Bundle, *published.Report) {
	tb.Helper()
	reference(tb) // skips outside of the once
	importOnce.Do(func() { imported, importReport = fromReference(tb) })
	if imported == nil {
		tb.Fatal("the import failed before")
	}
	return imported, importReport
}

func referenceSteps(tb testing.TB) []published.Step {
	tb.Helper()
	in, err := os.Open(filepath.Join(reference(tb), "pb2002", "PB2002_steps.dat.txt"))
	if err != nil {
		tb.Fatal(err)
	}
	defer in.Close()
	steps, tally, err := published.ReadSteps("steps", in, published.BirdCodes())
	if err != nil || tally.Rejected > 0 {
		tb.Fatalf("%v, %+v", err, tally)
	}
	return steps
}

// coincident reports which steps have the same two ends as another: two pairs of
// the table do, where the Molucca Sea plate is drawn with no width.
func coincident(steps []published.Step) map[int]bool {
	key := func(a, b sphere.LonLat) [2]sphere.LonLat { return [2]sphere.LonLat{a, b} }
	first := map[[2]sphere.LonLat]int{}
	out := map[int]bool{}
	for i, s := range steps {
		for _, k := range [][2]sphere.LonLat{key(s.From, s.To), key(s.To, s.From)} {
			if j, ok := first[k]; ok {
				out[i], out[j] = true, true
			}
		}
		first[key(s.From, s.To)] = i
	}
	return out
}

// Every step of Bird (2003), Table 2, comes back for its own midpoint: class,
// plates and distance 0, and with the motion model pb2002 the velocity that the
// table gives.
func TestReferenceStepsComeBack(t *testing.T) {
	b, report := importedModel(t)
	if n := report.Rejected(); n != 0 {
		t.Errorf("%d lines of the reference were rejected", n)
	}
	steps := referenceSteps(t)
	if len(steps) != 5819 {
		t.Fatalf("%d steps, want 5819", len(steps))
	}
	twice := coincident(steps)
	if len(twice) != 4 {
		t.Fatalf("%d coincident steps, want two pairs", len(twice))
	}
	l, err := b.Model.Lookup(setting.Options{Motion: published.PB2002})
	if err != nil {
		t.Fatal(err)
	}
	var a setting.Answer
	wrong, compared := 0, 0
	worstKm, worstRate, worstAz := 0.0, 0.0, 0.0
	for i, s := range steps {
		if twice[i] {
			continue
		}
		arc, _ := sphere.NewArc(sphere.FromLonLat(s.From), sphere.FromLonLat(s.To))
		at := arc.Midpoint().LonLat()
		if err := l.At(setting.SiteAt(at.Lon, at.Lat), &a); err != nil {
			t.Fatal(err)
		}
		n := a.Nearest
		worstKm = max(worstKm, n.DistanceKm)
		if n.Boundary.Type() != s.Type || n.Boundary.Left() != s.Left || n.Boundary.Right() != s.Right || n.Boundary.Subducting() != s.Subducting || n.DistanceKm > 1e-5 {
			if wrong++; wrong < 10 {
				t.Errorf("step %d: %v %s %s at %g km, subducting %q; want %v %s %s", s.Seq, n.Boundary.Type(), n.Boundary.Left(), n.Boundary.Right(), n.DistanceKm, n.Boundary.Subducting(), s.Type, s.Left, s.Right)
			}
			continue
		}
		if !n.Motion.Known || n.Motion.Model != published.PB2002 {
			t.Fatalf("step %d has no motion", s.Seq)
		}
		worstRate = max(worstRate, math.Abs(n.Motion.RateMmYr-s.SpeedMmYr))
		if math.Abs(n.Motion.RateMmYr-s.SpeedMmYr) > 0.1 {
			t.Errorf("step %d: %.2f mm/yr, the table says %.1f", s.Seq, n.Motion.RateMmYr, s.SpeedMmYr)
		}
		// below 2 mm/yr a tenth turns the azimuth by degrees
		if s.SpeedMmYr < 2 {
			continue
		}
		compared++
		az := n.Motion.AzimuthDeg
		if n.Motion.Plate != s.Left { // the right plate seen from the left
			az += 180
		}
		off := math.Abs(math.Mod(az-s.AzimuthDeg+540, 360) - 180)
		worstAz = max(worstAz, off)
		if off > 0.6 {
			t.Errorf("step %d: azimuth %.1f, the table says %.0f", s.Seq, az, s.AzimuthDeg)
		}
	}
	if wrong > 0 {
		t.Errorf("%d of %d steps do not come back", wrong, len(steps))
	}
	if compared < 5000 {
		t.Errorf("only %d azimuths were compared", compared)
	}
	t.Logf("greatest distance %.2g km, difference of speed %.3f mm/yr, of azimuth %.2f° (%d compared)", worstKm, worstRate, worstAz, compared)
}

// Every node of every grid comes back within 0.1 km of depth, and the other layers
// as published.
func TestReferenceGridsComeBack(t *testing.T) {
	b, _ := importedModel(t)
	slabs := map[string]*slab.Slab{}
	for _, s := range b.Model.Slabs() {
		slabs[s.ID] = s
	}
	depths, err := filepath.Glob(filepath.Join(reference(t), "slab2", "*_slab2_dep_*.xyz.gz"))
	if err != nil || len(depths) != 4 {
		t.Fatalf("%v, %d slabs in full, want 4", err, len(depths))
	}
	for _, path := range depths {
		zone := filepath.Base(path)[:3]
		s := slabs[zone]
		if s == nil {
			t.Errorf("slab %s is not in the model", zone)
			continue
		}
		n, worst := 0, 0.0
		eachNode(t, path, func(lon, lat, value float64) {
			r, ok := s.Surface.At(sphere.FromLonLat(sphere.LonLat{Lon: lon, Lat: lat}))
			if math.IsNaN(value) {
				if ok && !math.IsNaN(r.DepthKm) {
					t.Errorf("%s: %g, %g has no depth and came back with %g", zone, lon, lat, r.DepthKm)
				}
				return
			}
			n++
			if !ok || !(math.Abs(r.DepthKm+value) <= 0.1) {
				t.Errorf("%s: %g, %g has %g km and came back with %g, %v", zone, lon, lat, -value, r.DepthKm, ok)
				return
			}
			worst = max(worst, math.Abs(r.DepthKm+value))
		})
		eachNode(t, strings.Replace(path, "_dep_", "_unc_", 1), func(lon, lat, value float64) {
			if r, ok := s.Surface.At(sphere.FromLonLat(sphere.LonLat{Lon: lon, Lat: lat})); ok && !math.IsNaN(value) && math.Abs(r.SigmaKm-value) > 0.1 {
				t.Errorf("%s: %g, %g has σ %g and came back with %g", zone, lon, lat, value, r.SigmaKm)
			}
		})
		if n < 1000 {
			t.Errorf("%s: only %d nodes", zone, n)
		}
		t.Logf("%s: %d nodes, greatest difference %.2g km; tied to %v, %s under %s", zone, n, worst, s.BoundaryIDs, s.Subducting, s.Overriding)
	}
}

// Slabs go down from the boundaries, and under the plates, that any text on the
// region names; codes as in Bird (2003).
func TestReferenceSlabsAreTied(t *testing.T) {
	b, _ := importedModel(t)
	for _, s := range b.Model.Slabs() {
		want, ok := map[string]string{
			"cas": "JF under NA", "hel": "NU under AT", "izu": "PA under MA", "van": "AU under NH",
			"tonga": "PA under TO", "peru": "NZ under SA", "sangihe": "MS under SU", "makran": "AR under EU", "himalaya": "IN under EU",
		}[s.ID]
		if got := s.Subducting + " under " + s.Overriding; ok && got != want {
			t.Errorf("%s: %s, want %s", s.ID, got, want)
		}
		if ok && len(s.BoundaryIDs) == 0 {
			t.Errorf("%s is tied to nothing", s.ID)
		}
		for _, id := range s.BoundaryIDs {
			x, _ := b.Model.Network().Boundary(id)
			if x.Type() == boundary.Subduction && s.Kind == slab.Subduction && x.Subducting() == s.Overriding && x.Left() != s.Subducting && x.Right() != s.Subducting {
				t.Errorf("%s is tied to %s, where %s goes down", s.ID, id, x.Subducting())
			}
		}
	}
}

// The faults of the table are kept with the edition: the two pairs of coincident
// steps, and little else.
func TestReferenceFaultsAreKept(t *testing.T) {
	b, _ := importedModel(t)
	count := map[string]int{}
	for _, w := range b.Model.Warnings() {
		count[w.Code]++
	}
	if count["network_coincident"] != 2 || count["rejected_line"] != 0 {
		t.Errorf("warnings %v, want two coincident legs and no rejected line", count)
	}
	network := 0
	for _, n := range []string{"open_end", "plates", "crossing", "touch", "disconnected", "areas", "coincident"} {
		network += count["network_"+n]
	}
	if network != len(b.Model.Network().Faults()) {
		t.Errorf("%d faults of the network are kept, and it has %d", network, len(b.Model.Network().Faults()))
	}
	t.Logf("warnings %v", count)
}

// What an operator gains over the built-in model, as the README states it. The
// sites are drawn evenly over the sphere from a fixed seed.
func TestReferenceDepartures(t *testing.T) {
	if testing.Short() {
		t.Skip("40,000 answers; not in short mode")
	}
	b, _ := importedModel(t)
	base, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	const sites = 20000
	r := rand.New(rand.NewPCG(20261201, 2))
	var off, near []float64
	same, samePlate, sameType, younger := 0, 0, 0, 0
	for range sites {
		lon, lat := r.Float64()*360-180, math.Asin(2*r.Float64()-1)*180/math.Pi
		x, err := base.Model.At(setting.SiteAt(lon, lat))
		if err != nil {
			t.Fatal(err)
		}
		y, err := b.Model.At(setting.SiteAt(lon, lat))
		if err != nil {
			t.Fatal(err)
		}
		d := math.Abs(x.Nearest.DistanceKm - y.Nearest.DistanceKm)
		off = append(off, d)
		if y.Nearest.DistanceKm < 100 {
			near = append(near, d)
		}
		if x.Label == y.Label {
			same++
		}
		if x.Plate.Code == y.Plate.Code {
			samePlate++
		} else if slices.Contains([]string{"CP", "LW", "MQ", "SR"}, x.Plate.Code) {
			younger++ // a plate that Bird (2003) does not have
		}
		if x.Nearest.Boundary.Type() == y.Nearest.Boundary.Type() {
			sameType++
		}
	}
	var depth []float64
	for _, s := range b.Model.Slabs() {
		if len(s.ID) != 3 {
			continue // of the base
		}
		for _, p := range slab.Spots(s.Surface) {
			mine, ok := s.Surface.At(p)
			if !ok {
				continue
			}
			best := math.Inf(1)
			for _, o := range base.Model.Slabs() {
				if z, ok := o.Surface.At(p); ok {
					best = min(best, math.Abs(z.DepthKm-mine.DepthKm))
				}
			}
			if !math.IsInf(best, 1) {
				depth = append(depth, best)
			}
		}
	}
	got := fmt.Sprintf("distance %.0f/%.0f km, within 100 km %.0f/%.0f km, label %.0f %%, plate %.0f %%, type %.0f %%, slab %.0f/%.0f km",
		quantile(off, 0.5), quantile(off, 0.95), quantile(near, 0.5), quantile(near, 0.95),
		100*float64(same)/sites, 100*float64(samePlate)/sites, 100*float64(sameType)/sites, quantile(depth, 0.5), quantile(depth, 0.95))
	t.Logf("%s (%d sites within 100 km, %d places on slabs; %d of %d other plates are ones that Bird lacks)", got, len(near), len(depth), younger, sites-samePlate)
	if 2*younger < sites-samePlate {
		t.Errorf("%d of %d other plates are ones that Bird (2003) lacks; the README says most", younger, sites-samePlate)
	}
	if quantile(off, 0.95) > 100 || float64(same) < 0.8*sites || float64(samePlate) < 0.97*sites || quantile(depth, 0.95) > 60 || len(depth) < 100 {
		t.Errorf("the two models differ more than the README says: %s", got)
	}
}

func quantile(x []float64, q float64) float64 {
	if len(x) == 0 {
		return math.NaN()
	}
	x = slices.Clone(x)
	slices.Sort(x)
	return x[int(q*float64(len(x)-1))]
}
