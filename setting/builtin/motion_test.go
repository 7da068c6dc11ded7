package builtin_test

import (
	"encoding/csv"
	"math"
	"strconv"
	"strings"
	"testing"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// The anchors on which the small plates of NNR-MORVEL56 are composed: Argus et
// al. (2011), Table 2, from memory.
var anchors = map[string]string{
	"EU": "AT AS", "NA": "OK", "SA": "AP ND", "CA": "PM", "AU": "BH CR FT KE MO NI SS TO WL",
	"PS": "CL MA", "SU": "BS BU MS TI", "YZ": "ON", "NZ": "EA GP JZ", "AN": "SL", "PA": "BR MN NB NH SB",
}

func vectors(m *motion.Model) map[string]sphere.Vec {
	out := map[string]sphere.Vec{}
	for _, e := range m.Entries() {
		out[e.Plate] = e.Vector
	}
	return out
}

func TestComposedPoles(t *testing.T) {
	nnr := motionModel(t, "nnr-morvel56")
	here, there := vectors(nnr), vectors(motionModel(t, "pb2002"))
	n := 0
	for anchor, plates := range anchors {
		for _, plate := range strings.Fields(plates) {
			n++
			if got := nnr.Basis(plate); got != motion.Composed(anchor) {
				t.Errorf("plate %s: basis %q, want composed on %s", plate, got, anchor)
				continue
			}
			want := motion.Compose(here[anchor], there[plate], there[anchor])
			// written to 0.001 degrees of position and 0.0001 degrees per Myr
			tol := (here[plate].Norm()*0.0008 + 0.00006) * math.Pi / 180
			if d := here[plate].Sub(want).Norm(); d > tol {
				t.Errorf("plate %s: %+v, composed again %+v: %g rad/Myr apart, more than rounding's %g", plate, motion.PoleOf(here[plate]), motion.PoleOf(want), d, tol)
			}
		}
	}
	published := 0
	for _, e := range nnr.Entries() {
		if e.Basis == motion.Published {
			published++
		}
	}
	if n != 31 || published != len(argus2011) || len(nnr.Entries()) != 56 {
		t.Errorf("%d composed in the test, %d published and %d in all; want 31, 25 and 56", n, published, len(nnr.Entries()))
	}
	for _, code := range argus2011 {
		if nnr.Basis(code) != motion.Published {
			t.Errorf("plate %s: basis %q, want published", code, nnr.Basis(code))
		}
	}
	for _, name := range []string{"itrf2014", "pb2002"} {
		for _, e := range motionModel(t, name).Entries() {
			if e.Basis != motion.Published {
				t.Errorf("%s, plate %s: basis %q, want published", name, e.Plate, e.Basis)
			}
		}
	}
	for _, code := range bird2003 {
		if _, ok := there[code]; !ok {
			t.Errorf("pb2002 lacks plate %s", code)
		}
	}
}

// Velocities worked out from the published poles with another program: Argus et
// al. (2011), Table 1; Altamimi et al. (2017), Table 1; Bird (2003), Table 1.
// "mm/yr @ azimuth", "-" where the publication has no such plate.
const relativeMotions = `
PA-NA | -121.5 |  36.0 |  51.6 @324 |  49.5 @323 |  46.4 @324
PA-NA | -165.0 |  53.5 |  67.8 @324 |  67.1 @326 |  64.9 @328
PA-AU | -172.5 | -25.0 |  69.0 @271 |  69.8 @273 |  69.0 @275
NZ-PA | -113.0 | -30.0 | 145.8 @104 | 141.8 @104 | 151.1 @103
CO-PA | -104.3 |  10.0 | 101.6 @78  | -          | 101.2 @82
NZ-SA |  -71.5 | -20.0 |  72.5 @75  |  64.9 @78  |  78.9 @77
CO-CA |  -88.0 |  12.5 |  73.0 @21  | -          |  76.2 @21
JF-NA | -125.0 |  45.0 |  34.4 @47  | -          |  38.1 @62
EU-NA |  -18.0 |  65.0 |  18.5 @103 |  15.6 @104 |  18.5 @105
NU-NA |  -44.9 |  26.1 |  23.3 @102 |  22.4 @99  |  23.6 @102
NU-SA |  -13.3 | -20.0 |  32.6 @78  |  30.7 @77  |  34.3 @78
AU-AN |  100.0 | -48.0 |  69.0 @32  |  72.4 @32  |  71.4 @30
AR-EU |   49.0 |  33.0 |  27.9 @7   |  20.9 @357 |  31.9 @1
IN-EU |   85.0 |  28.0 |  45.0 @22  |  37.9 @14  |  48.5 @13
AU-SU |  107.0 | -10.0 |  66.0 @16  | -          |  58.6 @12
SM-NU |   36.0 |  -2.0 |   4.6 @93  |   4.4 @83  |   4.2 @90
PA-PS |  143.0 |  30.0 |  43.0 @281 | -          |  55.6 @288
`

func TestRelativeMotions(t *testing.T) {
	number := func(s string) float64 {
		x, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	rows := 0
	for line := range strings.Lines(strings.TrimSpace(relativeMotions)) {
		cell := strings.Split(line, "|")
		plate, ref, _ := strings.Cut(strings.TrimSpace(cell[0]), "-")
		lon, lat := number(cell[1]), number(cell[2])
		rows++
		for i, name := range []string{"nnr-morvel56", "itrf2014", "pb2002"} {
			got, ok := relativeAt(motionModel(t, name), plate, ref, lon, lat)
			rate, azimuth, known := strings.Cut(cell[3+i], "@")
			if ok != known {
				t.Errorf("%s %s-%s: known %v, want %v", name, plate, ref, ok, known)
			}
			if !ok || !known {
				continue
			}
			if math.Abs(got.RateMmYr-number(rate)) > 0.3 || math.Abs(math.Remainder(got.AzimuthDeg-number(azimuth), 360)) > 0.5+1e-9 {
				t.Errorf("%s %s-%s at %g, %g: %.2f mm/yr at %.2f, want %s at %s", name, plate, ref, lon, lat, got.RateMmYr, got.AzimuthDeg, rate, azimuth)
			}
		}
	}
	if rows != 17 {
		t.Fatalf("%d rows, want 17", rows)
	}
}

// Every step of Bird's (2003) Table 2 with our pb2002 poles: the left plate's
// velocity relative to the right one in the middle of the step.
func TestPB2002AgainstTheStepsTable(t *testing.T) {
	f := reference(t, "pb2002/PB2002_steps.csv")
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	ours := map[string]string{"AF": "NU", "SO": "SM", "YA": "YZ"}
	code := func(s string) string {
		if c, ok := ours[s]; ok {
			return c
		}
		return s
	}
	mm := motionModel(t, "pb2002")
	col := map[string]int{}
	for i, h := range rows[0] {
		col[h] = i
	}
	var worst struct{ speed, azimuth, component float64 }
	for _, r := range rows[1:] {
		num := func(name string) float64 {
			x, err := strconv.ParseFloat(r[col[name]], 64)
			if err != nil {
				t.Fatalf("step %s, %s: %v", r[0], name, err)
			}
			return x
		}
		pair := r[col["PlateBoundIdentifer"]]
		left, right := code(pair[:2]), code(pair[3:])
		a := sphere.LonLat{Lon: num("StartLong"), Lat: num("StartLat")}
		b := sphere.LonLat{Lon: num("FinalLong"), Lat: num("FinalLat")}
		got, ok := alongLeg(mm, left, right, a, b, false)
		if !ok {
			t.Fatalf("step %s: pb2002 lacks %s or %s", r[0], left, right)
		}
		speed := math.Abs(got.RateMmYr - num("VelocityLeft"))
		azimuth := math.Abs(math.Remainder(got.AzimuthDeg-num("VelocityAzimuth"), 360))
		component := 0.0
		if num("StepLength(km)") > 20 { // shorter steps carry the rounding of their ends into their azimuth
			component = max(math.Abs(got.OpeningMmYr-num("VelocityDivergent")), math.Abs(got.ShearMmYr-num("VelocityRightLateral")))
		}
		worst.speed, worst.azimuth, worst.component = max(worst.speed, speed), max(worst.azimuth, azimuth), max(worst.component, component)
		if speed > 0.1 || azimuth > 0.6 || component > 0.5 {
			t.Errorf("step %s (%s): %.2f mm/yr at %.1f, opening %.2f, right-lateral %.2f; want %s at %s, %s, %s", r[0], pair,
				got.RateMmYr, got.AzimuthDeg, got.OpeningMmYr, got.ShearMmYr,
				r[col["VelocityLeft"]], r[col["VelocityAzimuth"]], r[col["VelocityDivergent"]], r[col["VelocityRightLateral"]])
		}
	}
	if len(rows)-1 != 5819 {
		t.Errorf("%d steps, want 5819", len(rows)-1)
	}
	t.Logf("%d steps differ by at most %.3f mm/yr, %.2f degrees and, in a component, %.2f mm/yr", len(rows)-1, worst.speed, worst.azimuth, worst.component)
}
