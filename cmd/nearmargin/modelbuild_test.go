package main

import (
	"crypto/sha256"
	"encoding/hex"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// smallWorld holds files as authors publish them, with invented numbers.
const smallWorld = root + "/setting/bundle/published/testdata/small"

func smallFile(name string) string { return filepath.Join(smallWorld, name) }

func smallSum(t *testing.T, name string) string {
	t.Helper()
	raw, err := os.ReadFile(smallFile(name))
	if err != nil {
		t.Fatal(err)
	}
	h := sha256.Sum256(raw)
	return hex.EncodeToString(h[:])
}

func TestModelBuild(t *testing.T) {
	s := httptest.NewServer(http.FileServer(http.Dir(smallWorld)))
	defer s.Close()
	bad := filepath.Join(t.TempDir(), "poles.dat")
	raw, err := os.ReadFile(smallFile("poles.dat"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(bad, append(raw, "XX   95.000     0.000   0.1000\n"...), 0o644); err != nil {
		t.Fatal(err)
	}
	full := filepath.Join(t.TempDir(), "full")
	if err := os.MkdirAll(filepath.Join(full, "x"), 0o755); err != nil {
		t.Fatal(err)
	}
	steps, poles := smallFile("steps.dat"), smallFile("poles.dat")
	const other = "0000000000000000000000000000000000000000000000000000000000000000"
	for _, c := range []struct {
		name   string
		args   []string // DIR stands for a new directory
		status int
		stdout string
		stderr string
	}{
		{"steps and poles", []string{"--dir", "DIR", "--edition", "1", "--steps", steps, "--poles", poles}, 0, "published@1 written to", ""},
		{"everything", []string{"--dir", "DIR", "--id", "own", "--edition", "2", "--steps", steps, "--poles", poles, "--plates", smallFile("plates.dig"), "--orogens", smallFile("orogens.dig"), "--slab2", smallWorld, "--velocities", "mine=" + smallFile("velocities.csv"), "--default-motion", "mine"}, 0, "own@2 written to", "files are not named as grids of slabs"},
		{"GeoJSON with a mapping", []string{"--dir", "DIR", "--boundaries", smallFile("boundaries.geojson"), "--poles", poles, "--map", "id=NR,name=LABEL,type=KIND,left_plate=L,right_plate=R,subducting_plate=DOWN,type:SPREAD=spreading_ridge"}, 0, "3 boundaries", ""},
		{"an address with its checksum", []string{"--dir", "DIR", "--steps", s.URL + "/steps.dat", "--poles", poles, "--sha256", s.URL + "/steps.dat=" + smallSum(t, "steps.dat")}, 0, "9 boundaries", ""},
		{"the built-in model with a slab", []string{"--dir", "DIR", "--base", "builtin", "--slab2", smallWorld}, 0, "57 plates", ""},
		{"a rejected line that is let pass", []string{"--dir", "DIR", "--steps", steps, "--poles", bad, "--max-rejected", "0.25"}, 0, "1 warnings in warnings.csv", bad + ":4: columns 3-11"},
		{"a rejected line too many", []string{"--dir", "DIR", "--steps", steps, "--poles", bad}, 1, "", "1 of 4 lines were rejected, more than a share of 0.01"},
		{"it is named", []string{"--dir", "DIR", "--steps", steps, "--poles", bad}, 1, "", bad + ":4: columns 3-11, the latitude"},
		{"another checksum", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--sha256", steps + "=" + other}, 1, "", "its sha256 is " + smallSum(t, "steps.dat") + "; it should be " + other},
		{"a checksum of nothing", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--sha256", "x=" + other}, 2, "", "--sha256 names x, which is no source"},
		{"a checksum that is none", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--sha256", "x=12"}, 2, "", "want SRC=HEX"},
		{"an absent address", []string{"--dir", "DIR", "--steps", s.URL + "/none", "--poles", poles}, 1, "", "404 Not Found"},
		{"too large", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--max-download-mb", "0"}, 2, "", "must be more than 0"},
		{"no directory", []string{"--steps", steps, "--poles", poles}, 2, "", "--dir is missing"},
		{"a directory in use", []string{"--dir", full, "--steps", steps, "--poles", poles}, 1, "", "is not empty"},
		{"nothing", []string{"--dir", "DIR"}, 2, "", "give --steps, --boundaries or --base"},
		{"a base alone", []string{"--dir", "DIR", "--base", "builtin"}, 2, "", "nothing is given to build from"},
		{"no velocities", []string{"--dir", "DIR", "--steps", steps}, 2, "", "give --poles, --velocities or --base"},
		{"two networks", []string{"--dir", "DIR", "--steps", steps, "--boundaries", steps}, 2, "", "both given"},
		{"a mapping of nothing", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--map", "name=X"}, 2, "", "there is no --boundaries"},
		{"a bad mapping", []string{"--dir", "DIR", "--boundaries", steps, "--poles", poles, "--map", "x=y"}, 2, "", `there is no field "x"`},
		{"velocities without a name", []string{"--dir", "DIR", "--steps", steps, "--velocities", "x.csv"}, 2, "", "want NAME=SRC"},
		{"bad codes", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--plate-codes", "AF"}, 2, "", "--plate-codes"},
		{"a share", []string{"--dir", "DIR", "--steps", steps, "--poles", poles, "--max-rejected", "2"}, 2, "", "--max-rejected"},
		{"an unknown base", []string{"--dir", "DIR", "--base", "nowhere", "--steps", steps}, 1, "", "name a model directory"},
		{"an argument", []string{"x", "--dir", "DIR"}, 2, "", "got 1 arguments"},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "new")
			args := []string{"model", "build"}
			for _, a := range c.args {
				if a == "DIR" {
					a = dir
				}
				args = append(args, a)
			}
			got := invoke(t, nil, "", args...)
			if got.status != c.status || !strings.Contains(got.stdout, c.stdout) || !strings.Contains(got.stderr, c.stderr) {
				t.Fatalf("status %d, want %d\nstdout %.300q, want %q in it\nstderr %.600q, want %q in it", got.status, c.status, got.stdout, c.stdout, got.stderr, c.stderr)
			}
			if c.status != exitDone {
				if _, err := os.Stat(dir); err == nil {
					t.Error("the directory was written though the build failed")
				}
				return
			}
			if p := invoke(t, nil, "", "point", "20", "0", "--model", dir); p.status != exitDone || !strings.Contains(p.stdout, `"code":"NU"`) {
				t.Errorf("point on the built model: status %d, %.300s%s", p.status, p.stdout, p.stderr)
			}
		})
	}
}

func TestModelBuildFromTheEnvironment(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "new")
	env := map[string]string{
		"NEARMARGIN_DIR": dir, "NEARMARGIN_STEPS": smallFile("steps.dat"), "NEARMARGIN_POLES": smallFile("poles.dat"),
		"NEARMARGIN_SLAB2": smallFile("zzz_slab2_dep_01.01.26.xyz") + "\n" + smallFile("zzz_slab2_unc_01.01.26.xyz"),
	}
	if got := invoke(t, env, "", "model", "build"); got.status != exitDone || !strings.Contains(got.stdout, "1 slabs") {
		t.Fatalf("status %d, %s%s", got.status, got.stdout, got.stderr)
	}
	check := invoke(t, nil, "", "model", "check", dir)
	if check.status != exitDone || !strings.Contains(check.stdout, "3 plates, 9 boundaries") {
		t.Errorf("check: status %d, %s%s", check.status, check.stdout, check.stderr)
	}
}

// The warnings that stand with an edition are named by model check.
func TestModelCheckNamesWarnings(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "new")
	bad := filepath.Join(t.TempDir(), "orogens.dig")
	raw, err := os.ReadFile(smallFile("orogens.dig"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(bad, append(raw, "Loose\n1,2\n"...), 0o644); err != nil {
		t.Fatal(err)
	}
	got := invoke(t, nil, "", "model", "build", "--dir", dir, "--steps", smallFile("steps.dat"), "--poles", smallFile("poles.dat"), "--orogens", bad, "--max-rejected", "0.5")
	if got.status != exitDone {
		t.Fatal(got.stderr)
	}
	check := invoke(t, nil, "", "model", "check", dir)
	if want := `warning kept with the edition: rejected_line: orogens.dig:8: segment "Loose" does not end`; check.status != exitDone || !strings.Contains(check.stdout, want) {
		t.Errorf("status %d, %s; want %q", check.status, check.stdout, want)
	}
}
