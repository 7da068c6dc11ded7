package published

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/boundary"
	"nearmargin/setting/bundle"
	"nearmargin/setting/sphere"
)

// An invented row in the fixed columns of the table of steps.
const stepRow = `   7 :AF\SO   10.000   0.000   11.000   0.000 111.2  90  12.5 271   -3.1   12.1  -1584 260 :SUB*`

func TestParseStep(t *testing.T) {
	p, err := parseStep(stepRow, BirdCodes())
	if err != nil {
		t.Fatal(err)
	}
	want := Step{
		Seq: 7, Left: "NU", Right: "SM", Subducting: "NU", Type: boundary.Subduction,
		From: sphere.LonLat{Lon: 10, Lat: 0}, To: sphere.LonLat{Lon: 11, Lat: 0},
		LengthKm: 111.2, SpeedMmYr: 12.5, AzimuthDeg: 271, OpeningMmYr: -3.1, RightLateralMm: 12.1, InOrogen: true,
	}
	if p != want {
		t.Errorf("got  %+v\nwant %+v", p, want)
	}
	edit := func(old, new string) string {
		t.Helper()
		if !strings.Contains(stepRow, old) || len(old) != len(new) {
			t.Fatalf("%q cannot take the place of %q", new, old)
		}
		return strings.Replace(stepRow, old, new, 1)
	}
	for _, c := range []struct{ name, row, left, right, sinks string }{
		{"the right plate goes down", edit(`AF\SO`, "AF/SO"), "NU", "SM", "SM"},
		{"the class decides", edit(":SUB*", " CTF "), "NU", "SM", ""},
		{"without the last blank", strings.TrimSuffix(stepRow, "*"), "NU", "SM", "NU"},
		{"a code of its own", edit(`AF\SO`, `YA\NB`), "YZ", "NB", "YZ"},
	} {
		if p, err := parseStep(c.row, BirdCodes()); err != nil || p.Left != c.left || p.Right != c.right || p.Subducting != c.sinks {
			t.Errorf("%s: %+v, %v", c.name, p, err)
		}
	}
	for _, c := range []struct{ name, row, want string }{
		{"short", stepRow[:90], "has 90 characters"},
		{"long", stepRow + " ", "has 97 characters"},
		{"no number", edit("   7", "   x"), "the number of the step"},
		{"class", edit("SUB", "SUP"), `"SUP" is none of`},
		{"plates", edit(`AF\SO`, `AF+SO`), "is not two codes"},
		{"lower case", edit(`AF\SO`, `af\SO`), "is not two codes"},
		{"one plate", edit(`AF\SO`, `AF\AF`), "both plates"},
		{"which plate goes down", edit(`AF\SO`, `AF-SO`), "must say which plate goes down"},
		{"latitude", edit("11.000   0.000", "11.000  95.000"), "is not a longitude and a latitude"},
		{"a letter in a number", edit("10.000", "1O.000"), `columns 12-20, the start longitude: "1O.000"`},
		{"not finite", edit("12.5", " Inf"), "the speed"},
		{"no length", edit("11.000", "10.000"), "coincide"},
		{"columns out of place", edit("111.2", "222.4"), "a column is out of place"},
		{"a length too short", edit("111.2", " 55.6"), "are 111.2 km apart and the length says 55.6"},
	} {
		if _, err := parseStep(c.row, nil); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q in it", c.name, err, c.want)
		}
	}
}

func TestRunsJoinWhatContinues(t *testing.T) {
	at := func(lon float64) sphere.LonLat { return sphere.LonLat{Lon: lon, Lat: 0} }
	step := func(seq int, from, to float64, kind boundary.Type, left, right string) Step {
		return Step{Seq: seq, Left: left, Right: right, Type: kind, From: at(from), To: at(to)}
	}
	ridge, fault := boundary.SpreadingRidge, boundary.OceanicTransform
	list, err := Runs([]Step{
		step(1, 0, 1, ridge, "AA", "BB"), step(2, 1, 2, ridge, "AA", "BB"),
		step(3, 2, 3, fault, "AA", "BB"), // another type
		step(4, 3, 4, fault, "AA", "CC"), // another pair
		step(5, 5, 6, fault, "AA", "CC"), // a gap
		step(6, 6, 5.5, fault, "CC", "AA"),
		step(7, 179, -179, ridge, "AA", "BB"),
	}, func(code string) string { return "Plate " + code })
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, b := range list {
		var lons []string
		for _, p := range b.Path() {
			lons = append(lons, fmt.Sprint(p.Lon))
		}
		got = append(got, b.ID()+"|"+b.Name()+"|"+b.Source()+"|"+strings.Join(lons, " "))
	}
	want := []string{
		"aa-bb-1|Plate AA-Plate BB spreading ridge|Bird (2003), steps 1 to 2|0 1 2",
		"aa-bb-2|Plate AA-Plate BB oceanic transform|Bird (2003), step 3|2 3",
		"aa-cc-1|Plate AA-Plate CC oceanic transform|Bird (2003), step 4|3 4",
		"aa-cc-2|Plate AA-Plate CC oceanic transform|Bird (2003), step 5|5 6",
		"cc-aa-1|Plate CC-Plate AA oceanic transform|Bird (2003), step 6|6 5.5",
		"aa-bb-3|Plate AA-Plate BB spreading ridge|Bird (2003), step 7|179 -179",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got  %q\nwant %q", got, want)
	}
}

func TestReadDig(t *testing.T) {
	const end = "*** end of line segment ***\n"
	for _, c := range []struct {
		name, text string
		titles     []string
		points     int
		rejects    []string
	}{
		{"two segments", "A  x\n 1,2\n +3.0E+00,4\n" + end + "B\n5,6\n7,8\n" + end, []string{"A  x", "B"}, 4, nil},
		{"CRLF, a byte order mark, blank lines", "\ufeffA\r\n\r\n 1,2\r\n 3,4\r\n***\r\n", []string{"A"}, 2, nil},
		{"a vertex twice", "A\n1,2\n1,2\n3,4\n" + end, []string{"A"}, 2, nil},
		{"longitude beyond 180", "A\n190,2\n-190,4\n" + end, []string{"A"}, 2, nil},
		{"bytes of another encoding", "A  M\xfcller\n1,2\n3,4\n" + end, []string{"A  M?ller"}, 2, nil},
		{"one point", "A\n1,2\n" + end, nil, 0, []string{`f:1: "A" has 1 points`}},
		{"no title", "1,2\n3,4\n" + end + "B\n5,6\n7,8\n" + end, []string{"B"}, 2, []string{"f:1: a point before any title"}},
		{"a bad line takes its segment", "A\n1,2\nx,4\n5,6\n" + end + "B\n5,6\n7,8\n" + end, []string{"B"}, 2, []string{`f:3: "x,4" is no lon,lat; segment "A", begun in line 1, is left out`}},
		{"latitude", "A\n1,2\n1,91\n3,4\n" + end, nil, 0, []string{"f:3: 1, 91 is not a longitude and a latitude"}},
		{"not finite", "A\n1,2\nNaN,1\n" + end, nil, 0, []string{"f:3: NaN, 1 is not"}},
		{"no end", "A\n1,2\n3,4\n", nil, 0, []string{`f:1: segment "A" does not end`}},
		{"an end too many", end, nil, 0, []string{"f:1: an end of a segment"}},
	} {
		out, tally, err := ReadDig("f", strings.NewReader(c.text))
		if err != nil {
			t.Fatal(err)
		}
		var titles []string
		n := 0
		for _, o := range out {
			titles = append(titles, o.Title)
			n += len(o.Path)
		}
		if !slices.Equal(titles, c.titles) || n != c.points || tally.Read != len(out) || len(tally.Rejects) != len(c.rejects) {
			t.Errorf("%s: %q with %d points, %+v", c.name, titles, n, tally)
			continue
		}
		for i, r := range tally.Rejects {
			if !strings.HasPrefix(r.String(), c.rejects[i]) {
				t.Errorf("%s: rejected %q, want %q", c.name, r, c.rejects[i])
			}
		}
	}
}

func TestZones(t *testing.T) {
	open := Outline{Line: 1, Title: "Laptev Sea   by one, 2001", Path: []sphere.LonLat{{Lon: 0, Lat: 0}, {Lon: 10, Lat: 0}, {Lon: 5, Lat: 8}}}
	line := Outline{Line: 9, Title: "Line", Path: open.Path[:2]}
	tally := Tally{File: "f", Read: 2}
	zones := Zones([]Outline{open, line}, &tally)
	if len(zones) != 1 || zones[0].Name != "Laptev Sea" || zones[0].Kind.String() != "extension" || zones[0].Source != "Bird (2003), orogens; by one, 2001" || len(zones[0].Rings[0]) != 4 {
		t.Errorf("zones %+v", zones)
	}
	if tally.Read != 1 || tally.Rejected != 1 || tally.Rejects[0].Line != 9 {
		t.Errorf("tally %+v", tally)
	}
	if len(open.Path) != 3 {
		t.Error("the outline was changed")
	}
}

func TestReadPoles(t *testing.T) {
	const text = `AF   59.000   -73.000   0.9000  invented
PA    0.000     0.000   0.0000
AF   59.000   -73.000   0.9000  again
af   59.000   -73.000   0.9000
CA   59.000   -73.000   9x
CA   59.000  -373.000   0.9000
CA   59.000   -73.000 300.0000
`
	poles, tally, err := ReadPoles("f", strings.NewReader(text), BirdCodes())
	if err != nil || len(poles) != 2 || tally.Read != 2 || tally.Rejected != 5 {
		t.Fatalf("%+v, %+v, %v", poles, tally, err)
	}
	if p := poles[0]; p.Plate != "NU" || p.Fixed || !slices.Equal(p.Numbers, []string{"59.000", "-73.000", "0.9000", ""}) {
		t.Errorf("%+v", p)
	}
	if !poles[1].Fixed {
		t.Error("PA has the rate 0 and is not fixed")
	}
	for i, want := range []string{"plate NU stands in line 1 already", "no plate code", "has 26 characters", "columns 12-21, the longitude", "columns 22-30, the rate"} {
		if r := tally.Rejects[i]; r.Line != i+3 || !strings.Contains(r.Reason, want) {
			t.Errorf("%v, want line %d and %q", r, i+3, want)
		}
	}
}

func TestParseGridLine(t *testing.T) {
	for _, c := range []struct {
		layer, line string
		value       float64
		want        string
	}{
		{"dep", "227.05, 54,-12.5", 12.5, ""},
		{"dep", "227,54,0", 0, ""},
		{"dep", "227,54,NaN", math.NaN(), ""},
		{"dep", "227,54,12.5", 0, "12.5 is not a depth in negative km"},
		{"dep", "227,54,-900", 0, "is not a depth"},
		{"dep", "227,54", 0, "is not lon,lat,value"},
		{"dep", "227,54,-1,-1", 0, "is not lon,lat,value"},
		{"dep", "227,x,-1", 0, `"x" is not a number`},
		{"dep", "361,54,-1", 0, "is not a longitude"},
		{"dep", "NaN,54,-1", 0, "is not a longitude"},
		{"dep", "227,54,-Inf", 0, "is not a depth"},
		{"unc", "227,54,-1", 0, "is not an uncertainty"},
		{"dip", "227,54,91", 0, "is not a dip"},
		{"str", "227,54,-10", 350, ""},
		{"str", "227,54,360", 0, ""},
		{"thk", "227,54,88", 88, ""},
	} {
		n, err := parseGridLine(c.line, c.layer)
		switch {
		case c.want != "":
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%s %q: %v, want %q", c.layer, c.line, err, c.want)
			}
		case err != nil || n.Value != c.value && !(math.IsNaN(n.Value) && math.IsNaN(c.value)) || math.Signbit(n.Value) && n.Value == 0 || n.Lat != 54:
			t.Errorf("%s %q: %+v, %v", c.layer, c.line, n, err)
		}
	}
}

func TestReadVelocities(t *testing.T) {
	for _, c := range []struct {
		name, text string
		form       bundle.MotionForm
		rows       string // plate:numbers, joined
		rejects    string // in the reason of the only reject
		err        string
	}{
		{"poles without σ", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\n", bundle.PoleForm, "PA:1 2 0.5 ", "", ""},
		{"a name beats a code", "plate,name,lat_deg,lon_deg,rate_deg_myr,rate_sigma_deg_myr\nnb,Nubia,1,2,0.5,0.1\n", bundle.PoleForm, "NU:1 2 0.5 0.1", "", ""},
		{"NB without a name", "plate,lat_deg,lon_deg,rate_deg_myr\nnb,1,2,0.5\nPA,1,2,0.5\n", bundle.PoleForm, "PA:1 2 0.5 ", "map it (NB=NU)", ""},
		{"NB beside NU", "plate,lat_deg,lon_deg,rate_deg_myr\nNB,1,2,0.5\nNU,1,2,0.5\n", bundle.PoleForm, "NB:1 2 0.5 |NU:1 2 0.5 ", "", ""},
		{"a mapped code", "plate,lat_deg,lon_deg,rate_deg_myr\nso,1,2,0.5\n", bundle.PoleForm, "SM:1 2 0.5 ", "", ""},
		{"Cartesian, columns in another order", "wy_mas_yr,plate,wx_mas_yr,wz_mas_yr,sx_mas_yr,sy_mas_yr,sz_mas_yr\n2,PA,1,3,.1,.2,.3\n", bundle.CartesianForm, "PA:1 2 3 .1 .2 .3", "", ""},
		{"covariance", "plate,wx_mas_yr,wy_mas_yr,wz_mas_yr,cxx,cxy,cxz,cyy,cyz,czz\nPA,1,2,3,1,0,0,1,0,1\n", bundle.CovarianceForm, "PA:1 2 3 1 0 0 1 0 1", "", ""},
		{"a byte order mark, upper case", "\ufeffPLATE, LAT_DEG, LON_DEG, RATE_DEG_MYR\nPA, +1, 2, 0.5\n", bundle.PoleForm, "PA:1 2 0.5 ", "", ""},
		{"twice", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nPA,1,2,0.6\n", bundle.PoleForm, "PA:1 2 0.5 ", "stands in line 2 already", ""},
		{"too few fields", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nNU,1\n", bundle.PoleForm, "PA:1 2 0.5 ", "has 2 fields", ""},
		{"no number", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nNU,1,2,fast\n", bundle.PoleForm, "PA:1 2 0.5 ", `rate_deg_myr is "fast"`, ""},
		{"no latitude", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nNU,91,2,1\n", bundle.PoleForm, "PA:1 2 0.5 ", "are no position", ""},
		{"a σ below 0", "plate,lat_deg,lon_deg,rate_deg_myr,rate_sigma_deg_myr\nPA,1,2,0.5,\nNU,1,2,1,-1\n", bundle.PoleForm, "PA:1 2 0.5 ", "must be 0 or more", ""},
		{"no plate's rate", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nNU,1,2,9999\n", bundle.PoleForm, "PA:1 2 0.5 ", "not a plate's rate", ""},
		{"a quotation mark", "plate,lat_deg,lon_deg,rate_deg_myr\nPA,1,2,0.5\nN\"U,1,2,1\n", bundle.PoleForm, "PA:1 2 0.5 ", `bare "`, ""},
		{"no columns", "a,b\n1,2\n", 0, "", "", "f:1: the columns are a,b; they must hold plate,"},
		{"empty", "", 0, "", "", "the first line must name the columns"},
		{"no row", "plate,lat_deg,lon_deg,rate_deg_myr\n", 0, "", "", "no row could be read"},
	} {
		form, rows, tally, err := ReadVelocities("f", strings.NewReader(c.text), knownPlates(), BirdCodes())
		if c.err != "" {
			if err == nil || !strings.Contains(err.Error(), c.err) {
				t.Errorf("%s: error %v, want %q", c.name, err, c.err)
			}
			continue
		}
		var got []string
		for _, r := range rows {
			got = append(got, r.Plate+":"+strings.Join(r.Numbers, " "))
		}
		if err != nil || form != c.form || strings.Join(got, "|") != c.rows || tally.Read != len(rows) {
			t.Errorf("%s: form %d, %q, %+v, %v", c.name, form, got, tally, err)
		}
		if c.rejects == "" && tally.Rejected != 0 || c.rejects != "" && (tally.Rejected != 1 || !strings.Contains(tally.Rejects[0].Reason, c.rejects)) {
			t.Errorf("%s: rejected %v, want %q", c.name, tally.Rejects, c.rejects)
		}
	}
}

func TestParseCodes(t *testing.T) {
	c, err := ParseCodes(" AF=NU, SO=SM ,")
	if err != nil || c.String() != "AF=NU,SO=SM" || c.of("AF") != "NU" || c.of("PA") != "PA" {
		t.Errorf("%v, %v", c, err)
	}
	for _, s := range []string{"AF", "=NU", "AF=nu", "AF=NUB", "AF=NU,AF=SM"} {
		if _, err := ParseCodes(s); err == nil {
			t.Errorf("%q was taken", s)
		}
	}
}
