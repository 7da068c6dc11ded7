package api

import (
	"net/http/httptest"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"nearmargin/setting/builtin"
)

// TestGeneratedClient generates a Go client from the document as it stands, compiles it,
// and uses it against the service on the built-in model. The module testdata/client
// names the generator and what the client needs, by version and checksum; it stands
// apart so that the service depends on none of it.
func TestGeneratedClient(t *testing.T) {
	if testing.Short() {
		t.Skip("compiles a generator")
	}
	dir := t.TempDir()
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("testdata", "client"))); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, "openapi.json"), OpenAPI(), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := os.Mkdir(filepath.Join(dir, "nearmargin"), 0o755); err != nil {
		t.Fatal(err)
	}
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	srv := httptest.NewServer(newRig(t, b.Model))
	defer srv.Close()
	run := func(args ...string) ([]byte, error) {
		c := exec.CommandContext(t.Context(), "go", args...)
		c.Dir = dir
		c.Env = append(os.Environ(), "GOWORK=off", "NEARMARGIN_URL="+srv.URL)
		return c.CombinedOutput()
	}
	if out, err := run("mod", "download"); err != nil {
		if os.Getenv("NEARMARGIN_REQUIRE_TOOLS") == "1" {
			t.Fatalf("the generator cannot be had: %v\n%s", err, out)
		}
		t.Skipf("the generator cannot be had from the module proxy: %v\n%s", err, out)
	}
	for _, args := range [][]string{
		{"tool", "oapi-codegen", "-config", "oapi-codegen.yaml", "openapi.json"},
		{"vet", "./..."},
		{"test", "-count=1", "./..."},
	} {
		if out, err := run(args...); err != nil {
			t.Fatalf("go %v: %v\n%.8000s", args, err, out)
		}
	}
}
