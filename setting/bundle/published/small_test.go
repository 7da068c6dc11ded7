package published

import (
	"bytes"
	"compress/gzip"
	"errors"
	"flag"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nearmargin/setting/bundle"
)

var update = flag.Bool("update", false, "write the golden files anew")

// small returns a file of the small, invented world.
func small(name string) *File {
	path := filepath.Join("testdata", "small", name)
	return &File{Name: path, Open: func() (io.ReadCloser, error) { return os.Open(path) }}
}

// text returns a file of the text given.
func text(name, s string) *File {
	return &File{Name: name, Open: func() (io.ReadCloser, error) { return io.NopCloser(strings.NewReader(s)), nil }}
}

// slurp returns the text of a file of the small world.
func slurp(tb testing.TB, name string) string {
	tb.Helper()
	raw, err := os.ReadFile(filepath.Join("testdata", "small", name))
	if err != nil {
		tb.Fatal(err)
	}
	return string(raw)
}

func smallGrids() []File {
	var out []File
	for _, layer := range []string{"dep", "unc", "dip", "str", "thk"} {
		out = append(out, *small("zzz_slab2_" + layer + "_01.01.26.xyz"))
	}
	return out
}

func smallRequest() Request {
	return Request{
		Identity: bundle.Identity{ID: "small", Edition: "1"},
		Steps:    small("steps.dat"), Plates: small("plates.dig"), Orogens: small("orogens.dig"), Poles: small("poles.dat"),
		Slab2: smallGrids(), Velocities: []Velocities{{"invented", *small("velocities.csv")}}, Codes: BirdCodes(),
	}
}

func mustBuild(tb testing.TB, q Request) (*bundle.Bundle, *Report) {
	tb.Helper()
	b, r, err := Build(q)
	if err != nil {
		tb.Fatal(err)
	}
	return b, r
}

// plainText returns a file's text, decompressed: how well gzip packs may change
// with its version, and what is packed may not.
func plainText(t *testing.T, name string, raw []byte) []byte {
	t.Helper()
	if !strings.HasSuffix(name, ".gz") {
		return raw
	}
	z, err := gzip.NewReader(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	out, err := io.ReadAll(z)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// TestGolden compares every file of the directory that the small world becomes
// with the one kept.
func TestGolden(t *testing.T) {
	b, _ := mustBuild(t, smallRequest())
	dir := filepath.Join(t.TempDir(), "model")
	if err := b.Write(dir); err != nil {
		t.Fatal(err)
	}
	golden := filepath.Join("testdata", "golden")
	if *update {
		if err := os.RemoveAll(golden); err != nil {
			t.Fatal(err)
		}
	}
	want := map[string]bool{}
	for _, name := range b.Files() {
		raw, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
		if err != nil {
			t.Fatal(err)
		}
		got := plainText(t, name, raw)
		at := filepath.Join(golden, filepath.FromSlash(strings.TrimSuffix(name, ".gz")))
		want[at] = true
		if *update {
			if err := errors.Join(os.MkdirAll(filepath.Dir(at), 0o755), os.WriteFile(at, got, 0o644)); err != nil {
				t.Fatal(err)
			}
		}
		kept, err := os.ReadFile(at)
		if err != nil {
			t.Errorf("%s is written and not among the golden files: %v", name, err)
		} else if !bytes.Equal(got, kept) {
			t.Errorf("%s differs (write it anew with -update)\n got: %s\nwant: %s", name, got, kept)
		}
	}
	err := filepath.WalkDir(golden, func(p string, e fs.DirEntry, err error) error {
		if err == nil && e.Type().IsRegular() && !want[p] {
			t.Errorf("%s is not written", p)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
}

// The same files give the same bytes, and what was written reads as the same
// model.
func TestBuildIsDeterministicAndReadsBack(t *testing.T) {
	a, _ := mustBuild(t, smallRequest())
	b, _ := mustBuild(t, smallRequest())
	dir := filepath.Join(t.TempDir(), "model")
	if err := a.Write(dir); err != nil {
		t.Fatal(err)
	}
	c, err := bundle.Read(os.DirFS(dir))
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range a.Files() {
		if !bytes.Equal(a.File(name), b.File(name)) {
			t.Errorf("%s differs between two builds", name)
		}
		if !bytes.Equal(a.File(name), c.File(name)) {
			t.Errorf("%s differs after it was read back", name)
		}
	}
	if x, y, z := a.Model.SHA256(), b.Model.SHA256(), c.Model.SHA256(); x != y || x != z || len(x) != 64 {
		t.Errorf("checksums %s, %s, %s", x, y, z)
	}
}
