package main

import (
	"bytes"
	"fmt"
	"net/http"
	"net/http/httptest"
	"net/http/httputil"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// recipes returns the scripts of api/INTEGRATING.md.
func recipes(t *testing.T) (out []string) {
	t.Helper()
	for _, tool := range []string{"sh", "curl", "split", "xargs", "awk", "cmp", "sha256sum"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
	raw, err := os.ReadFile(filepath.Join(root, "api", "INTEGRATING.md"))
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range fenced.FindAllStringSubmatch(string(raw), -1) {
		if b[1] == "sh" {
			out = append(out, b[2])
		}
	}
	return out
}

// recipeDir is a folder with the files that the recipes read: 1,000 rows each.
func recipeDir(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	for _, f := range tables {
		if err := os.WriteFile(filepath.Join(dir, "sites."+f.name), []byte(f.whole(1000)), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// runRecipe runs a script in a folder against the service at an address.
func runRecipe(dir, script, address string) (stdout, stderr string, err error) {
	c := exec.Command("sh", "-eu", "-c", strings.ReplaceAll(script, "127.0.0.1:8080", address))
	c.Dir = dir
	var out, errs bytes.Buffer
	c.Stdout, c.Stderr = &out, &errs
	err = c.Run()
	return out.String(), errs.String(), err
}

// TestRecipes runs every script of api/INTEGRATING.md. What follows "# →" must stand in
// what it prints, in that order.
func TestRecipes(t *testing.T) {
	scripts := recipes(t)
	if len(scripts) < 9 {
		t.Fatalf("only %d recipes", len(scripts))
	}
	address := startServer(t)
	for i, script := range scripts {
		t.Run(fmt.Sprint(i+1), func(t *testing.T) {
			out, errs, err := runRecipe(recipeDir(t), script, address)
			if err != nil {
				t.Fatalf("%v, stderr %s\n%s", err, errs, script)
			}
			told := 0
			rest := out
			for line := range strings.Lines(script) {
				_, want, ok := strings.Cut(line, "# → ")
				if !ok {
					continue
				}
				told++
				_, after, found := strings.Cut(rest, strings.TrimSpace(want))
				if !found {
					t.Errorf("%q is not printed; it printed %q", strings.TrimSpace(want), out)
				}
				rest = after
			}
			if told == 0 {
				t.Error("the recipe does not tell what it prints")
			}
		})
	}
}

// flaky passes requests on to a service, but breaks the answers of some of its batches off.
type flaky struct {
	proxy *httputil.ReverseProxy
	mu    sync.Mutex
	seen  int
	bad   func(n int) bool // the n-th batch, from 1
}

func (f *flaky) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	f.mu.Lock()
	f.seen++
	bad := f.bad != nil && f.bad(f.seen)
	f.mu.Unlock()
	if !bad {
		f.proxy.ServeHTTP(w, r)
		return
	}
	fmt.Fprintln(w, "id,lon,lat,ts_plate")
	_ = http.NewResponseController(w).Flush()
	panic(http.ErrAbortHandler)
}

// set chooses which batches are broken off and counts anew.
func (f *flaky) set(bad func(int) bool) (seen int) {
	f.mu.Lock()
	defer f.mu.Unlock()
	seen, f.seen, f.bad = f.seen, 0, bad
	return seen
}

// TestRecipesResume runs the recipes for parts and for the queue over a connection that
// breaks: each says so, and run again sends only what is not done; the result is the same
// as without a break.
func TestRecipesResume(t *testing.T) {
	whole, resumable := "", map[string]string{}
	for _, script := range recipes(t) {
		switch {
		case strings.Contains(script, "xargs -P 4"):
			resumable["parallel"] = script
		case strings.Contains(script, "one-part"):
			resumable["parts"] = script
		case strings.Contains(script, "send-queue"):
			resumable["queue"] = script
		case whole == "" && strings.Contains(script, "-T sites.csv"):
			whole = script
		}
	}
	if whole == "" || len(resumable) != 3 {
		t.Fatal("the recipes for a whole file, for parts, for parts at once and for a queue are not all there")
	}
	to, err := url.Parse("http://" + startServer(t))
	if err != nil {
		t.Fatal(err)
	}
	f := &flaky{proxy: httputil.NewSingleHostReverseProxy(to)}
	srv := httptest.NewServer(f)
	defer srv.Close()
	address := strings.TrimPrefix(srv.URL, "http://")
	read := func(dir string) string {
		t.Helper()
		raw, err := os.ReadFile(filepath.Join(dir, "annotated.csv"))
		if err != nil {
			t.Fatal(err)
		}
		return string(raw)
	}
	dir := recipeDir(t)
	if _, errs, err := runRecipe(dir, whole, address); err != nil {
		t.Fatalf("%v: %s", err, errs)
	}
	want := read(dir)
	for _, name := range []string{"parts", "parallel"} {
		dir, script := recipeDir(t), resumable[name]
		f.set(func(n int) bool { return n >= 3 })
		if out, _, err := runRecipe(dir, script, address); err == nil || strings.Contains(out, "complete") {
			t.Errorf("%s: error %v though answers broke off; it printed %q", name, err, out)
		}
		done, err := filepath.Glob(filepath.Join(dir, "parts", "*.csv"))
		if err != nil || len(done) != 2 {
			t.Fatalf("%s: %d parts are done after 2 whole answers: %v", name, len(done), err)
		}
		f.set(nil)
		if out, errs, err := runRecipe(dir, script, address); err != nil || !strings.Contains(out, "complete") {
			t.Errorf("%s: %v, printed %q, stderr %s", name, err, out, errs)
		}
		if n := f.set(nil); n != 2 {
			t.Errorf("%s: %d parts were sent again, want 2", name, n)
		}
		if read(dir) != want {
			t.Errorf("%s: the table differs from that of the whole file", name)
		}
	}
	dir = recipeDir(t)
	f.set(func(n int) bool { return true })
	if out, _, err := runRecipe(dir, resumable["queue"], address); err == nil {
		t.Errorf("the queue was emptied though the answer broke off: %q", out)
	}
	if left, err := filepath.Glob(filepath.Join(dir, "queue", "*.json")); err != nil || len(left) != 2 {
		t.Errorf("%d records are left: %v", len(left), err)
	}
	f.set(nil)
	if out, errs, err := runRecipe(dir, resumable["queue"], address); err != nil {
		t.Errorf("%v, printed %q, stderr %s", err, out, errs)
	}
}
