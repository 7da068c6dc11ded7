package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// TestSectionCommand: given arguments, expect a status, and what stands on either
// stream.
func TestSectionCommand(t *testing.T) {
	for _, c := range []struct {
		name   string
		args   []string
		status int
		stdout string // begins with
		stderr string // contained in
	}{
		{"a figure", []string{"-72.4", "-36.1"}, exitDone, "<?xml", ""},
		{"JSON", []string{"-72.4", "-36.1", "--format", "json"}, exitDone, `{"site":{"lon":-72.4,"lat":-36.1,`, ""},
		{"a site at depth", []string{"--format=json", "--depth-km", "25", "-72.4", "-36.1"}, exitDone, `{"site":{"lon":-72.4,"lat":-36.1,"depth_km":25`, ""},
		{"no slab near", []string{"10", "50"}, exitFailed, "", "10, 50: no slab lies within 200 km of the site; the nearest is"},
		{"one argument", []string{"10"}, exitUsage, "", "want LON LAT, got 1"},
		{"not a number", []string{"10", "north"}, exitUsage, "", `LAT: "north"`},
		{"out of range", []string{"10", "95"}, exitUsage, "", "95 is out of range"},
		{"an unknown format", []string{"-72.4", "-36.1", "--format", "pdf"}, exitUsage, "", "svg or json"},
		{"an unknown ending", []string{"-72.4", "-36.1", "--out", "x.pdf"}, exitUsage, "", "x.pdf names no format"},
		{"an unknown motion model", []string{"-72.4", "-36.1", "--motion", "x"}, exitUsage, "", "itrf2014"},
		{"an unknown model", []string{"-72.4", "-36.1", "--model", "/none"}, exitFailed, "", "name a model directory"},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := invoke(t, nil, "", append([]string{"section"}, c.args...)...)
			if got.status != c.status || !strings.HasPrefix(got.stdout, c.stdout) || !strings.Contains(got.stderr, c.stderr) {
				t.Errorf("status %d, want %d\nstdout %.200q, want %q at its start\nstderr %.400q, want %q in it", got.status, c.status, got.stdout, c.stdout, got.stderr, c.stderr)
			}
			if c.status != exitDone && got.stdout != "" {
				t.Errorf("a failed run printed %.200q", got.stdout)
			}
		})
	}
}

// TestSectionWritesFiles: the ending of a file's name decides the form; a run that
// fails leaves no file.
func TestSectionWritesFiles(t *testing.T) {
	dir := t.TempDir()
	figure, data, none := filepath.Join(dir, "chile.svg"), filepath.Join(dir, "chile.JSON"), filepath.Join(dir, "none.svg")
	for _, out := range []string{figure, data} {
		if got := invoke(t, nil, "", "section", "-72.4", "-36.1", "--out", out); got.status != exitDone || got.stdout != "" {
			t.Fatalf("status %d, stdout %q, stderr %s", got.status, got.stdout, got.stderr)
		}
	}
	raw, err := os.ReadFile(figure)
	if err != nil || !strings.HasSuffix(string(raw), "</svg>\n") {
		t.Errorf("the figure ends with %.40q, %v", raw[max(0, len(raw)-40):], err)
	}
	if raw, err = os.ReadFile(data); err != nil || !json.Valid(raw) {
		t.Errorf("not JSON: %.80q, %v", raw, err)
	}
	if got := invoke(t, nil, "", "section", "10", "50", "--out", none); got.status != exitFailed {
		t.Errorf("status %d", got.status)
	}
	if left, _ := os.ReadDir(dir); len(left) != 2 {
		t.Errorf("%d files, want 2", len(left))
	}
}
