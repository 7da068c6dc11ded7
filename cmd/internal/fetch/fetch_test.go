package fetch

import (
	"archive/tar"
	"archive/zip"
	"bytes"
	"compress/gzip"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

func sum(s string) string {
	h := sha256.Sum256([]byte(s))
	return hex.EncodeToString(h[:])
}

func write(t *testing.T, name, text string) string {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(name), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(name, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return name
}

func text(t *testing.T, f File) string {
	t.Helper()
	raw, err := os.ReadFile(f.Path)
	if err != nil {
		t.Fatal(err)
	}
	return string(raw)
}

// server answers with texts, redirects and faults.
func server(t *testing.T) *httptest.Server {
	t.Helper()
	mux := http.NewServeMux()
	mux.HandleFunc("/steps.dat", func(w http.ResponseWriter, r *http.Request) {
		if got := r.Header.Get("Accept-Encoding"); got != "identity" {
			t.Errorf("Accept-Encoding is %q", got)
		}
		fmt.Fprint(w, "some steps")
	})
	mux.Handle("/moved", http.RedirectHandler("/steps.dat?x=1", http.StatusFound))
	mux.Handle("/round", http.RedirectHandler("/round", http.StatusFound))
	mux.HandleFunc("/broken", func(w http.ResponseWriter, r *http.Request) {
		w.Header().Set("Content-Length", "100")
		fmt.Fprint(w, "half")
	})
	mux.HandleFunc("/stream", func(w http.ResponseWriter, r *http.Request) {
		for range 100 { // without a length
			fmt.Fprint(w, "0123456789")
			w.(http.Flusher).Flush()
		}
	})
	mux.HandleFunc("/large", func(w http.ResponseWriter, r *http.Request) { fmt.Fprint(w, strings.Repeat("x", 1000)) })
	mux.HandleFunc("/slow", func(w http.ResponseWriter, r *http.Request) { <-r.Context().Done() })
	s := httptest.NewServer(mux)
	t.Cleanup(s.Close)
	return s
}

func TestOne(t *testing.T) {
	s := server(t)
	dir := t.TempDir()
	here := write(t, filepath.Join(dir, "a", "steps.dat"), "some steps")
	write(t, filepath.Join(dir, "b", "one"), "1")
	write(t, filepath.Join(dir, "b", "two"), "2")
	for _, c := range []struct {
		name, source, sum string
		want              string // in the error; "" where the text must come
	}{
		{"file", here, "", ""},
		{"file and checksum", here, sum("some steps"), ""},
		{"checksum in capitals", here, strings.ToUpper(sum("some steps")), ""},
		{"a directory of one file", filepath.Join(dir, "a"), "", ""},
		{"address", s.URL + "/steps.dat", "", ""},
		{"address and checksum", s.URL + "/steps.dat", sum("some steps"), ""},
		{"redirect", s.URL + "/moved", sum("some steps"), ""},
		{"another checksum", s.URL + "/steps.dat", sum("x"), "its sha256 is " + sum("some steps") + "; it should be " + sum("x")},
		{"another checksum of a file", here, sum("x"), "its sha256 is " + sum("some steps")},
		{"checksum of a directory", filepath.Join(dir, "a"), sum("x"), "a checksum is of one file"},
		{"two files", filepath.Join(dir, "b"), "", "holds 2 files"},
		{"an empty directory", t.TempDir(), "", "holds no file"},
		{"absent", filepath.Join(dir, "c"), "", "no such file"},
		{"not found", s.URL + "/nothing", "", "404 Not Found"},
		{"too many redirects", s.URL + "/round", "", "more than 10 redirects"},
		{"cut off", s.URL + "/broken", "", "unexpected EOF"},
		{"too large by its length", s.URL + "/large", "", "has 1000 bytes, more than the 500 allowed"},
		{"too large without a length", s.URL + "/stream", "", "has more than 500 bytes"},
		{"no answer in time", s.URL + "/slow", "", "deadline exceeded"},
		{"no server", "http://127.0.0.1:1/x", "", "refused"},
		{"no address", "http://%zz/", "", "invalid URL escape"},
	} {
		t.Run(c.name, func(t *testing.T) {
			f := &Fetcher{Dir: t.TempDir(), MaxBytes: 500, Timeout: 2 * time.Second}
			if c.name == "no answer in time" {
				f.Timeout = 50 * time.Millisecond
			}
			if c.sum != "" {
				f.Sums = map[string]string{c.source: c.sum}
			}
			got, err := f.One(context.Background(), c.source)
			if c.want != "" {
				if err == nil || !strings.Contains(err.Error(), c.want) || !strings.Contains(err.Error(), strings.TrimPrefix(c.source, "http://%zz/")) {
					t.Errorf("error %v, want the source and %q in it", err, c.want)
				}
				return
			}
			if err != nil || text(t, got) != "some steps" || !strings.HasPrefix(got.Name, c.source) {
				t.Errorf("%+v, %v", got, err)
			}
			if u := f.Unused(); len(u) != 0 {
				t.Errorf("unused checksums %v", u)
			}
		})
	}
}

func TestRedirectFromHTTPSToHTTP(t *testing.T) {
	plain := server(t)
	s := httptest.NewTLSServer(http.RedirectHandler(plain.URL+"/steps.dat", http.StatusFound))
	defer s.Close()
	f := &Fetcher{Dir: t.TempDir(), Client: s.Client()}
	if _, err := f.One(context.Background(), s.URL); err == nil || !strings.Contains(err.Error(), "redirected from https to http") {
		t.Errorf("error %v", err)
	}
}

func TestUnusedChecksum(t *testing.T) {
	f := &Fetcher{Dir: t.TempDir(), Sums: map[string]string{"b": sum(""), "a": sum("")}}
	if got := f.Unused(); strings.Join(got, " ") != "a b" {
		t.Errorf("%v", got)
	}
}

// pack makes an archive of the files given, name and text by turns.
func pack(t *testing.T, kind string, files ...string) string {
	t.Helper()
	var out bytes.Buffer
	check := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	if kind == ".zip" {
		z := zip.NewWriter(&out)
		for i := 0; i < len(files); i += 2 {
			w, err := z.Create(files[i])
			check(err)
			_, err = w.Write([]byte(files[i+1]))
			check(err)
		}
		check(z.Close())
	} else {
		g := gzip.NewWriter(&out)
		w := tar.NewWriter(g)
		check(w.WriteHeader(&tar.Header{Name: "link", Linkname: "/etc/passwd", Typeflag: tar.TypeSymlink}))
		for i := 0; i < len(files); i += 2 {
			check(w.WriteHeader(&tar.Header{Name: files[i], Mode: 0o644, Size: int64(len(files[i+1]))}))
			_, err := w.Write([]byte(files[i+1]))
			check(err)
		}
		check(w.Close())
		check(g.Close())
	}
	return write(t, filepath.Join(t.TempDir(), "a"+kind), out.String())
}

func TestArchives(t *testing.T) {
	for _, kind := range []string{".tar.gz", ".tgz", ".zip"} {
		a := pack(t, kind, "deep/two.xyz", "2", "../../one.xyz", "1")
		dir := t.TempDir()
		f := &Fetcher{Dir: dir}
		got, err := f.All(context.Background(), a)
		if err != nil || len(got) != 2 {
			t.Fatalf("%s: %+v, %v", kind, got, err)
		}
		for i, want := range []File{{a + "/deep/two.xyz", "2"}, {a + "/one.xyz", "1"}} {
			if got[i].Name != want.Name || text(t, got[i]) != want.Path || filepath.Dir(got[i].Path) != dir {
				t.Errorf("%s: %+v, want %s within %s", kind, got[i], want.Name, dir)
			}
		}
		f = &Fetcher{Dir: t.TempDir(), MaxBytes: 5}
		if _, err := f.All(context.Background(), pack(t, kind, "a", "123", "b", "456")); err == nil || !strings.Contains(err.Error(), "has more than 2 bytes") {
			t.Errorf("%s: more than is allowed: %v", kind, err)
		}
		if _, err := f.All(context.Background(), pack(t, kind)); err == nil || !strings.Contains(err.Error(), "holds no file") {
			t.Errorf("%s: empty: %v", kind, err)
		}
		bad := write(t, filepath.Join(t.TempDir(), "bad"+kind), "this is no archive at all")
		if _, err := f.All(context.Background(), bad); err == nil || !strings.Contains(err.Error(), bad) {
			t.Errorf("%s: no archive: %v", kind, err)
		}
	}
}
