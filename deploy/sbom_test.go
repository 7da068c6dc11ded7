package deploy

import (
	"bytes"
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
)

// checkSBOM checks the list of components that stands beside a program: by the
// schema of CycloneDX, and against what the go command says of the program.
func checkSBOM(t *testing.T, program string) {
	t.Helper()
	raw, err := os.ReadFile(program + ".cdx.json")
	if err != nil {
		t.Fatal(err)
	}
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	if err := cycloneDX(t).Validate(doc); err != nil {
		t.Errorf("the document is not by its schema: %v", err)
	}
	var bom struct {
		SpecVersion, SerialNumber string
		Metadata                  struct {
			Timestamp string
			Component struct {
				Name   string
				Hashes []struct{ Alg, Content string }
			}
		}
		Components []struct {
			Name, Version, Purl string
			Licenses            []struct{ License struct{ ID string } }
		}
	}
	if err := json.Unmarshal(raw, &bom); err != nil {
		t.Fatal(err)
	}
	if m := bom.Metadata; m.Component.Name != "nearmargin" || len(m.Component.Hashes) != 1 || m.Timestamp != "" || bom.SpecVersion != "1.6" {
		t.Errorf("metadata %+v", m)
	}
	found := map[string]string{}
	for _, c := range bom.Components {
		if len(c.Licenses) != 1 || c.Licenses[0].License.ID == "" || c.Purl == "" {
			t.Errorf("%s has no licence or no package URL", c.Name)
		}
		found[c.Name] = c.Version
	}
	out, err := exec.Command("go", "version", "-m", program).Output()
	if err != nil {
		t.Fatal(err)
	}
	modules := 0
	for line := range strings.Lines(string(out)) {
		f := strings.Fields(line)
		if len(f) < 3 || f[0] != "dep" {
			continue
		}
		modules++
		if found[f[1]] != f[2] {
			t.Errorf("%s %s is linked, listed is version %q", f[1], f[2], found[f[1]])
		}
	}
	if modules < 30 || found["std"] == "" || found["d3"] == "" || len(bom.Components) != modules+4 {
		t.Errorf("%d modules are linked, %d components listed", modules, len(bom.Components))
	}
}

// cycloneDX compiles the schema that comes with the library that writes the document.
func cycloneDX(t *testing.T) *jsonschema.Schema {
	t.Helper()
	dir, err := exec.Command("go", "list", "-m", "-f", "{{.Dir}}", "github.com/CycloneDX/cyclonedx-go").Output()
	if err != nil {
		t.Fatal(err)
	}
	c := jsonschema.NewCompiler()
	for name, file := range map[string]string{
		"bom-1.6.schema.json": "bom-1.6.schema.json", "spdx.schema.json": "spdx.schema.json", "jsf-0.82.schema.json": "jsf-0.82.schemax.json",
	} {
		raw, err := os.ReadFile(filepath.Join(strings.TrimSpace(string(dir)), "schema", file))
		if err != nil {
			t.Fatal(err)
		}
		doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(raw))
		if err != nil {
			t.Fatal(err)
		}
		if err := c.AddResource("http://cyclonedx.org/schema/"+name, doc); err != nil {
			t.Fatal(err)
		}
	}
	s, err := c.Compile("http://cyclonedx.org/schema/bom-1.6.schema.json")
	if err != nil {
		t.Fatal(err)
	}
	return s
}
