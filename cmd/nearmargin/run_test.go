package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// outcome is what one run of the program left.
type outcome struct {
	status         int
	stdout, stderr string
}

// invoke runs the program with an environment and an input.
func invoke(t *testing.T, env map[string]string, stdin string, args ...string) outcome {
	t.Helper()
	var out, errs bytes.Buffer
	p := &program{
		env:   func(k string) string { return env[k] },
		stdin: strings.NewReader(stdin), stdout: &out, stderr: &errs,
	}
	status := p.run(context.Background(), args)
	return outcome{status, out.String(), errs.String()}
}

func TestExitStatusAndMessages(t *testing.T) {
	missing := filepath.Join(t.TempDir(), "none.csv")
	for _, c := range []struct {
		name   string
		env    map[string]string
		stdin  string
		args   []string
		status int
		stdout string // contained in
		stderr string
	}{
		{"no command", nil, "", nil, 2, "", "nearmargin point LON LAT"},
		{"unknown command", nil, "", []string{"pont"}, 2, "", `no command "pont"`},
		{"help", nil, "", []string{"--help"}, 0, "Exit status", ""},
		{"help of a command", nil, "", []string{"point", "--help"}, 0, "NEARMARGIN_DEPTH_KM", ""},
		{"negative arguments", nil, "", []string{"point", "-72.4", "-36.1"}, 0, `"lon":-72.4`, ""},
		{"flag before the arguments", nil, "", []string{"point", "--motion", "itrf2014", "-72.4", "-36.1"}, 0, `"motion_model":"itrf2014"`, ""},
		{"flag after the arguments", nil, "", []string{"point", "-72.4", "-36.1", "--depth-km", "-2"}, 0, `"depth_km":-2`, ""},
		{"flag with an equals sign", nil, "", []string{"point", "-72.4", "-36.1", "--depth-km=33"}, 0, `"depth_km":33`, ""},
		{"flag from the environment", map[string]string{"NEARMARGIN_MOTION": "pb2002"}, "", []string{"point", "1", "2"}, 0, `"motion_model":"pb2002"`, ""},
		{"flag beats environment", map[string]string{"NEARMARGIN_MOTION": "pb2002"}, "", []string{"point", "1", "2", "--motion", "itrf2014"}, 0, `"motion_model":"itrf2014"`, ""},
		{"bad environment", map[string]string{"NEARMARGIN_DEPTH_KM": "deep"}, "", []string{"point", "1", "2"}, 2, "", "NEARMARGIN_DEPTH_KM"},
		{"one argument", nil, "", []string{"point", "1"}, 2, "", "want LON LAT"},
		{"not a number", nil, "", []string{"point", "east", "2"}, 2, "", `LON: "east"`},
		{"swapped", nil, "", []string{"point", "10", "120"}, 2, "", "are lon and lat swapped?"},
		{"unknown flag", nil, "", []string{"point", "1", "2", "--colour", "red"}, 2, "", "colour"},
		{"unknown motion model", nil, "", []string{"point", "1", "2", "--motion", "x"}, 2, "", "itrf2014, nnr-morvel56, pb2002"},
		{"unknown model", nil, "", []string{"point", "1", "2", "--model", missing}, 1, "", "name a model directory"},
		{"annotate", nil, "id,lon,lat\n007,1,2\n", []string{"annotate"}, 0, "007,1,2,NU,", ""},
		{"annotate with a bad row", nil, "lon,lat\n1,2\n1,95\n", []string{"annotate", "-", "--format", "csv"}, 3, "95 is out of range", "1 of 2"},
		{"annotate ndjson", nil, `{"lon":1,"lat":2}`, []string{"annotate", "-", "--format", "ndjson"}, 0, `"tectonic"`, ""},
		{"annotate without coordinates", nil, "a,b\n1,2\n", []string{"annotate"}, 1, "", "the columns are a, b"},
		{"annotate an absent file", nil, "", []string{"annotate", missing}, 1, "", "no such file"},
		{"annotate an unknown ending", nil, "", []string{"annotate", "x.xlsx"}, 2, "", "--format"},
		{"annotate an unknown format", nil, "", []string{"annotate", "-", "--format", "xml"}, 2, "", "csv, ndjson or geojson"},
		{"check", nil, "", []string{"model", "check", "builtin"}, 0, "57 plates", ""},
		{"export without a directory", nil, "", []string{"model", "export", "builtin"}, 2, "", "--dir"},
		{"rules", nil, "", []string{"model", "rules"}, 0, "limit ridge_axis", ""},
		{"version", nil, "", []string{"version"}, 0, "model builtin@", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := invoke(t, c.env, c.stdin, c.args...)
			if got.status != c.status || !strings.Contains(got.stdout, c.stdout) || !strings.Contains(got.stderr, c.stderr) {
				t.Errorf("status %d, want %d\nstdout %.300q, want %q in it\nstderr %.600q, want %q in it", got.status, c.status, got.stdout, c.stdout, got.stderr, c.stderr)
			}
		})
	}
}

func TestExportIsTheSameModel(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "model")
	if got := invoke(t, nil, "", "model", "export", "builtin", "--dir", dir); got.status != exitDone {
		t.Fatal(got.stderr)
	}
	here := invoke(t, nil, "", "point", "-72.4", "-36.1")
	there := invoke(t, nil, "", "point", "-72.4", "-36.1", "--model", dir)
	if here != there {
		t.Errorf("the exported model answers\n%s\nthe built-in one\n%s", there.stdout, here.stdout)
	}
	if got := invoke(t, nil, "", "model", "export", "builtin", "--dir", dir); got.status != exitFailed || !strings.Contains(got.stderr, "not empty") {
		t.Errorf("a second export into the same directory: status %d, %s", got.status, got.stderr)
	}
}

func TestCheckNamesThePlaceOfAFault(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "model")
	if got := invoke(t, nil, "", "model", "export", "builtin", "--dir", dir); got.status != exitDone {
		t.Fatal(got.stderr)
	}
	path := filepath.Join(dir, "boundaries.geojson")
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	// a boundary that no slab goes down from: a slab without its boundary is no model
	lines := strings.Split(string(raw), "\n")
	kept := lines[:0]
	for _, l := range lines {
		if !strings.Contains(l, `"id":"taupo-rift"`) {
			kept = append(kept, l)
		}
	}
	if len(kept) == len(lines) {
		t.Fatal("there is no taupo-rift to take out")
	}
	if err := os.WriteFile(path, []byte(strings.Join(kept, "\n")), 0o600); err != nil {
		t.Fatal(err)
	}
	// a slab that goes down from a line that is missing is no fault of the network
	if err := os.RemoveAll(filepath.Join(dir, "slabs")); err != nil {
		t.Fatal(err)
	}
	got := invoke(t, nil, "", "model", "check", dir)
	var ends []string
	for _, l := range strings.Split(got.stdout, "\n") {
		if strings.Contains(l, "open_end") {
			ends = append(ends, l)
		}
	}
	if got.status != exitFailed || len(ends) != 2 {
		t.Errorf("status %d, stdout %.500s: want the two nodes at the ends of the missing line", got.status, got.stdout)
	}
	for _, l := range ends { // both ends of the rift lie near 176°E
		if !strings.HasPrefix(l, "17") || !strings.Contains(l, "havre-trough") && !strings.Contains(l, "north-island") {
			t.Errorf("a fault far from the Taupo Rift: %s", l)
		}
	}
}

func TestOutAppearsWholeOrNotAtAll(t *testing.T) {
	dir := t.TempDir()
	out := filepath.Join(dir, "out.csv")
	if got := invoke(t, nil, "a,b\n1,2\n", "annotate", "-", "--out", out); got.status != exitFailed {
		t.Fatalf("status %d", got.status)
	}
	if left, _ := os.ReadDir(dir); len(left) > 0 {
		t.Errorf("a failed run left %v", left)
	}
	if got := invoke(t, nil, "lon,lat\n1,2\n", "annotate", "-", "--out", out); got.status != exitDone || got.stdout != "" {
		t.Fatalf("status %d, stdout %q", got.status, got.stdout)
	}
	raw, err := os.ReadFile(out)
	if err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(bytes.NewReader(raw)).ReadAll()
	if err != nil || len(rows) != 2 {
		t.Errorf("%d rows, %v", len(rows), err)
	}
}

// TestPointSaysWhatCSVSays compares the two doors' words and numbers.
func TestPointSaysWhatCSVSays(t *testing.T) {
	got := invoke(t, nil, "lon,lat\n142.5,39.3\n", "annotate")
	rows, err := csv.NewReader(strings.NewReader(got.stdout)).ReadAll()
	if err != nil || len(rows) != 2 {
		t.Fatalf("%v: %s", err, got.stdout)
	}
	cell := map[string]string{}
	for i, name := range rows[0] {
		cell[name] = rows[1][i]
	}
	var a struct {
		Plate   struct{ Code string }
		Setting struct {
			Label   string
			Reasons []string
		}
		Nearest struct {
			ID       string
			Distance json.Number `json:"distance_km"`
			Motion   struct {
				Rate json.Number `json:"rate_mm_yr"`
			} `json:"relative_motion"`
		} `json:"nearest_boundary"`
	}
	if err := json.Unmarshal([]byte(invoke(t, nil, "", "point", "142.5", "39.3").stdout), &a); err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]string{
		"ts_plate": a.Plate.Code, "ts_setting": a.Setting.Label, "ts_reason": a.Setting.Reasons[0],
		"ts_boundary_id": a.Nearest.ID, "ts_distance_km": a.Nearest.Distance.String(), "ts_rate_mm_yr": a.Nearest.Motion.Rate.String(),
	} {
		if cell[name] != want || want == "" {
			t.Errorf("%s is %q in the table and %q in JSON", name, cell[name], want)
		}
	}
}
