package main

import (
	"bytes"
	"crypto/sha256"
	"os"
	"path/filepath"
	"runtime/debug"
	"strings"
	"testing"
)

// TestVendored: every file that the map page brings along is in the document, in the
// version that the file itself names.
func TestVendored(t *testing.T) {
	dir := filepath.Join("..", "..", "api", "page", "static", "vendor")
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		base, _, _ := strings.Cut(e.Name(), ".")
		if strings.HasPrefix(base, "land-") {
			base = "world-atlas"
		}
		found := false
		for _, v := range vendored {
			if v.name != base {
				continue
			}
			found = true
			raw, err := os.ReadFile(filepath.Join(dir, e.Name()))
			if err != nil {
				t.Fatal(err)
			}
			if strings.HasSuffix(e.Name(), ".js") && !bytes.Contains(raw[:200], []byte("v"+v.version+" ")) {
				t.Errorf("%s is not of version %s: %.100s", e.Name(), v.version, raw)
			}
		}
		if !found {
			t.Errorf("%s is in no component", e.Name())
		}
	}
	if len(entries) < 5 {
		t.Errorf("%d files are vendored", len(entries))
	}
}

// TestUnlisted: a module without a known licence is no component, but an error.
func TestUnlisted(t *testing.T) {
	info := &debug.BuildInfo{GoVersion: "go1.26", Deps: []*debug.Module{{Path: "example.org/unheard", Version: "v1.0.0"}}}
	if _, err := document(info, [sha256.Size]byte{}); err == nil || !strings.Contains(err.Error(), "example.org/unheard v1.0.0") {
		t.Errorf("%v", err)
	}
	info.Deps[0].Replace = &debug.Module{Path: "github.com/labstack/echo/v4", Version: listed(t, "github.com/labstack/echo/v4")}
	bom, err := document(info, [sha256.Size]byte{})
	if err != nil || (*bom.Components)[1].Name != "github.com/labstack/echo/v4" {
		t.Errorf("a replaced module: %v", err)
	}
}

// listed returns the version in which this test is built with a module.
func listed(t *testing.T, path string) string {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join("..", "licences", "LICENCES.txt"))
	if err != nil {
		t.Fatal(err)
	}
	for line := range strings.Lines(string(raw)) {
		if f := strings.Fields(line); f[0] == path {
			return f[1]
		}
	}
	t.Fatalf("%s is not listed", path)
	return ""
}

func TestRunSaysWhatIsWrong(t *testing.T) {
	text := filepath.Join(t.TempDir(), "text")
	if err := os.WriteFile(text, []byte("no program"), 0o600); err != nil {
		t.Fatal(err)
	}
	for _, args := range [][]string{nil, {"a", "b"}, {text + "-absent"}, {text}} {
		if err := run(args, &bytes.Buffer{}); err == nil {
			t.Errorf("%v: no error", args)
		}
	}
}

func TestPackageURL(t *testing.T) {
	for _, c := range [][3]string{
		{"github.com/Masterminds/semver/v3", "v3.4.0", "pkg:golang/github.com/masterminds/semver/v3@v3.4.0"},
		{"example.org/a", "v2.0.0+incompatible", "pkg:golang/example.org/a@v2.0.0%2Bincompatible"},
	} {
		if got := golang(c[0], c[1]); got != c[2] {
			t.Errorf("%s, want %s", got, c[2])
		}
	}
}
