package setting_test

import (
	"os/exec"
	"strings"
	"testing"
)

// TestDomainImports proves that the domain knows no HTTP, no SQL and no JSON.
// Package bundle, which reads model files, may use encoders.
func TestDomainImports(t *testing.T) {
	for _, c := range []struct {
		pkg    string
		forbid []string
	}{
		{"nearmargin/setting", []string{"net/http", "database/sql", "encoding/json", "github.com/labstack/echo/v4", "github.com/jackc/pgx/v5", "github.com/paulmach/orb/geojson", "nearmargin/setting/bundle", "nearmargin/setting/builtin", "nearmargin/api"}},
		{"nearmargin/setting/sphere", []string{"nearmargin/setting/boundary", "encoding/json"}},
		{"nearmargin/setting/boundary", []string{"nearmargin/setting/motion", "nearmargin/setting", "encoding/json"}},
		{"nearmargin/setting/motion", []string{"nearmargin/setting/boundary", "nearmargin/setting", "encoding/json"}},
		{"nearmargin/setting/bundle", []string{"net/http", "database/sql", "github.com/labstack/echo/v4", "nearmargin/api", "nearmargin/setting/builtin"}},
		{"nearmargin/setting/bundle/published", []string{"net/http", "database/sql", "nearmargin/api", "nearmargin/cmd/internal/fetch", "nearmargin/setting/builtin"}},
		{"nearmargin/cmd/internal/fetch", []string{"nearmargin/setting"}},
		{"nearmargin/setting/revision", []string{"net/http", "database/sql", "encoding/json", "nearmargin/setting/bundle", "nearmargin/api"}},
		{"nearmargin/store", []string{"github.com/labstack/echo/v4", "nearmargin/api", "nearmargin/setting/builtin", "nearmargin/store/storetest"}},
		{"nearmargin/cmd/nearmargin", []string{"nearmargin/store/storetest", "github.com/testcontainers/testcontainers-go"}},
		{"nearmargin/api", []string{"nearmargin/setting/builtin", "nearmargin/setting/bundle"}},
	} {
		out, err := exec.Command("go", "list", "-deps", c.pkg).Output()
		if err != nil {
			t.Fatalf("go list -deps %s: %v", c.pkg, err)
		}
		deps := map[string]bool{}
		for _, d := range strings.Fields(string(out)) {
			deps[d] = true
		}
		if !deps["math"] {
			t.Fatalf("%s: no list of dependencies: %q", c.pkg, out)
		}
		for _, f := range c.forbid {
			if deps[f] && f != c.pkg {
				t.Errorf("%s depends on %s", c.pkg, f)
			}
		}
	}
}
