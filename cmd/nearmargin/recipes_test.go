package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// TestRecipes runs every script of api/INTEGRATING.md in a folder with a table of
// 1,000 rows. What follows "# →" must stand in what it prints, in that order.
func TestRecipes(t *testing.T) {
	for _, tool := range []string{"sh", "curl", "split", "xargs", "awk"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
	raw, err := os.ReadFile(filepath.Join(root, "api", "INTEGRATING.md"))
	if err != nil {
		t.Fatal(err)
	}
	address := startServer(t)
	blocks := fenced.FindAllStringSubmatch(string(raw), -1)
	if len(blocks) < 6 {
		t.Fatalf("only %d recipes", len(blocks))
	}
	for i, b := range blocks {
		t.Run(fmt.Sprint(i+1), func(t *testing.T) {
			dir := t.TempDir()
			for _, f := range tables {
				if err := os.WriteFile(filepath.Join(dir, "sites."+f.name), []byte(f.whole(1000)), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			c := exec.Command("sh", "-eu", "-c", strings.ReplaceAll(b[2], "127.0.0.1:8080", address))
			c.Dir = dir
			var errs bytes.Buffer
			c.Stderr = &errs
			out, err := c.Output()
			if err != nil {
				t.Fatalf("%v, stderr %s\n%s", err, &errs, b[2])
			}
			rest := string(out)
			for line := range strings.Lines(b[2]) {
				_, want, ok := strings.Cut(line, "# → ")
				if !ok {
					continue
				}
				_, after, found := strings.Cut(rest, strings.TrimSpace(want))
				if !found {
					t.Errorf("%q is not printed; it printed %q", strings.TrimSpace(want), out)
				}
				rest = after
			}
		})
	}
}
