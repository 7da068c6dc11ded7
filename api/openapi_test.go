package api

import (
	"bytes"
	"encoding/json"
	"go/ast"
	"go/parser"
	"go/token"
	"maps"
	"net/http"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"

	"nearmargin/api/wire"
	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

// document is the OpenAPI document as generic JSON.
func document(tb testing.TB) map[string]any {
	tb.Helper()
	v, err := jsonschema.UnmarshalJSON(bytes.NewReader(OpenAPI()))
	if err != nil {
		tb.Fatal(err)
	}
	return v.(map[string]any)
}

// compiler has the document loaded under documentURL.
func compiler(tb testing.TB) *jsonschema.Compiler {
	tb.Helper()
	c := jsonschema.NewCompiler()
	c.DefaultDraft(jsonschema.Draft2020)
	c.AssertFormat()
	doc := document(tb)
	delete(doc, "jsonSchemaDialect")
	if err := c.AddResource(documentURL, doc); err != nil {
		tb.Fatal(err)
	}
	return c
}

const documentURL = "https://nearmargin.invalid/openapi.json"

// schema compiles the schema of a name.
func schema(tb testing.TB, name string) *jsonschema.Schema {
	tb.Helper()
	s, err := compiler(tb).Compile(documentURL + "#/components/schemas/" + name)
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

// at walks down into generic JSON and follows references within the document.
func at(t *testing.T, doc map[string]any, path ...string) map[string]any {
	t.Helper()
	v := doc
	for _, key := range path {
		next, ok := v[key].(map[string]any)
		if !ok {
			t.Fatalf("openapi.json has no object %q in %v", key, path)
		}
		v = next
		if target, ok := v["$ref"].(string); ok {
			v = at(t, doc, strings.Split(strings.TrimPrefix(target, "#/"), "/")...)
		}
	}
	return v
}

// TestDocumentDescribesTheRoutes compares the paths and methods described with
// those served, both ways.
func TestDocumentDescribesTheRoutes(t *testing.T) {
	described, served := map[string]bool{}, map[string]bool{}
	doc := document(t)
	for path, item := range doc["paths"].(map[string]any) {
		for method := range item.(map[string]any) {
			described[strings.ToUpper(method)+" "+path] = true
			if method == "get" {
				described["HEAD "+path] = true // said once in the document for all
			}
		}
	}
	for _, r := range newRig(t).echo.Routes() {
		path := strings.NewReplacer(":id", "{id}", "*", "{file}").Replace(r.Path)
		served[r.Method+" "+path] = true
	}
	for _, r := range slices.Sorted(maps.Keys(served)) {
		if !described[r] {
			t.Errorf("%s is served and not described", r)
		}
	}
	for _, r := range slices.Sorted(maps.Keys(described)) {
		if !served[r] {
			t.Errorf("%s is described and not served", r)
		}
	}
}

// TestDocumentDescribesTheParameters asks every path that takes a query for what
// it takes, by a parameter that it does not know, and compares the two lists.
func TestDocumentDescribesTheParameters(t *testing.T) {
	doc, r := document(t), newRig(t)
	for path, item := range doc["paths"].(map[string]any) {
		for method := range item.(map[string]any) {
			op := at(t, doc, "paths", path, method)
			var want []string
			list, _ := op["parameters"].([]any)
			for _, p := range list {
				key := strings.TrimPrefix(p.(map[string]any)["$ref"].(string), "#/components/parameters/")
				param := at(t, doc, "components", "parameters", key)
				key = strings.TrimSuffix(key, "_required") // the same parameter where it must be given
				name := param["name"].(string)
				if strings.ReplaceAll(strings.ToLower(name), "-", "_") != key {
					t.Errorf("parameter %s is named %s", key, name)
				}
				if param["in"] == "query" {
					want = append(want, name)
				}
			}
			if want == nil {
				continue
			}
			w := r.ask(strings.ToUpper(method), path+"?no_such=1", "text/csv", "lon,lat\n")
			_, takes, _ := strings.Cut(problem(t, w).Errors[0].Detail, "it takes ")
			got := strings.Split(takes, ", ")
			slices.Sort(got)
			slices.Sort(want)
			if !slices.Equal(got, want) {
				t.Errorf("%s takes %v; described are %v", path, got, want)
			}
		}
	}
}

// TestSchemasCompile compiles every schema, and checks every example against its own.
func TestSchemasCompile(t *testing.T) {
	doc, c := document(t), compiler(t)
	compile := func(pointer string) *jsonschema.Schema {
		s, err := c.Compile(documentURL + "#" + pointer)
		if err != nil {
			t.Fatalf("%s: %v", pointer, err)
		}
		return s
	}
	for name := range at(t, doc, "components", "schemas") {
		compile("/components/schemas/" + name)
	}
	for name := range at(t, doc, "components", "parameters") {
		p := at(t, doc, "components", "parameters", name)
		s := compile("/components/parameters/" + name + "/schema")
		examples := []any{}
		if e, ok := p["example"]; ok {
			examples = append(examples, e)
		}
		if list, ok := p["examples"].(map[string]any); ok {
			for _, e := range list {
				examples = append(examples, e.(map[string]any)["value"])
			}
		}
		if len(examples) == 0 || p["description"] == "" {
			t.Errorf("parameter %s lacks an example or a description", name)
		}
		for _, e := range examples {
			if err := s.Validate(e); err != nil {
				t.Errorf("parameter %s: example %v: %v", name, e, err)
			}
		}
	}
	for name := range at(t, doc, "components", "headers") {
		if compile("/components/headers/" + name + "/schema"); at(t, doc, "components", "headers", name)["description"] == "" {
			t.Errorf("header %s lacks a description", name)
		}
	}
}

// TestObjectsAreClosed sees to it that no object schema lets unknown members
// pass, but for those that the caller sends or that carry the caller's own members.
func TestObjectsAreClosed(t *testing.T) {
	open := []string{"AnnotatedObject", "AnnotatedFeature", "AnnotatedCollection", "PolygonRequest", "MultiPolygonRequest", "FeatureRequest"}
	for name, s := range at(t, document(t), "components", "schemas") {
		s := s.(map[string]any)
		if s["type"] != "object" || slices.Contains(open, name) {
			continue
		}
		if s["additionalProperties"] != false {
			t.Errorf("schema %s does not forbid unknown members", name)
		}
		for member, d := range s["properties"].(map[string]any) {
			d := d.(map[string]any)
			_, isRef := d["$ref"]
			_, isConst := d["const"]
			if d["description"] == nil && !isRef && !isConst && member != "coordinates" {
				t.Errorf("schema %s: %s has no description", name, member)
			}
		}
	}
}

// TestEnumsMatchTheDomain compares the enums with the names that answers use.
func TestEnumsMatchTheDomain(t *testing.T) {
	doc := document(t)
	names := func(n int, name func(int) string) (out []string) {
		for i := range n {
			out = append(out, name(i))
		}
		return out
	}
	for _, c := range []struct {
		schema string
		want   []string
	}{
		{"Label", names(len(setting.AllLabels), func(i int) string { return setting.AllLabels[i].String() })},
		{"Family", names(len(setting.AllFamilies), func(i int) string { return setting.AllFamilies[i].String() })},
		{"BoundaryType", names(len(boundary.AllTypes), func(i int) string { return boundary.AllTypes[i].String() })},
		{"SlabKind", names(len(slab.AllKinds), func(i int) string { return slab.AllKinds[i].String() })},
		{"ZoneKind", names(len(setting.AllZoneKinds), func(i int) string { return setting.AllZoneKinds[i].String() })},
	} {
		var got []string
		for _, v := range at(t, doc, "components", "schemas", c.schema)["enum"].([]any) {
			got = append(got, v.(string))
		}
		slices.Sort(got)
		slices.Sort(c.want)
		if !slices.Equal(got, c.want) {
			t.Errorf("%s lists %v, the domain has %v", c.schema, got, c.want)
		}
	}
}

// TestNoteCodesMatchTheDomain compares the enum of note codes with the constants
// of type NoteCode in the source of package setting.
func TestNoteCodesMatchTheDomain(t *testing.T) {
	file, err := parser.ParseFile(token.NewFileSet(), "../setting/answer.go", nil, 0)
	if err != nil {
		t.Fatal(err)
	}
	var want, got []string
	ast.Inspect(file, func(n ast.Node) bool {
		spec, ok := n.(*ast.ValueSpec)
		if !ok {
			return true
		}
		if kind, ok := spec.Type.(*ast.Ident); ok && kind.Name == "NoteCode" {
			code, err := strconv.Unquote(spec.Values[0].(*ast.BasicLit).Value)
			if err != nil {
				t.Fatal(err)
			}
			want = append(want, code)
		}
		return true
	})
	for _, v := range at(t, document(t), "components", "schemas", "NoteCode")["enum"].([]any) {
		got = append(got, v.(string))
	}
	slices.Sort(got)
	slices.Sort(want)
	if len(want) == 0 || !slices.Equal(got, want) {
		t.Errorf("NoteCode lists %v, the domain has %v", got, want)
	}
}

// TestColumnsMatchTheTable compares the columns that the document says a table gains
// with those that it gains.
func TestColumnsMatchTheTable(t *testing.T) {
	text := at(t, document(t), "paths", "/v1/annotate", "post")["description"].(string)
	if want := "gains the columns " + strings.Join(wire.Columns[:], ", ") + ", each with the prefix"; !strings.Contains(text, want) {
		t.Errorf("the description does not say %q", want)
	}
}

// TestDocumentIsServed checks the bytes that /openapi.json sends.
func TestDocumentIsServed(t *testing.T) {
	w := newRig(t).get("/openapi.json")
	if w.Code != http.StatusOK || w.Header().Get("Content-Type") != "application/json" || !bytes.Equal(w.Body.Bytes(), OpenAPI()) {
		t.Errorf("status %d, type %q, %d bytes", w.Code, w.Header().Get("Content-Type"), w.Body.Len())
	}
	var doc struct {
		OpenAPI string
		Info    struct{ Description string }
	}
	if err := json.Unmarshal(OpenAPI(), &doc); err != nil {
		t.Fatal(err)
	}
	if !strings.HasPrefix(doc.OpenAPI, "3.1.") {
		t.Errorf("openapi is %q, want 3.1", doc.OpenAPI)
	}
	for _, must := range []string{"PRESENT DAY", "SCREENING AID", "national hazard models", "local codes", "licensed practice"} {
		if !strings.Contains(doc.Info.Description, must) {
			t.Errorf("the description does not say %q", must)
		}
	}
}

// TestDocumentBelowABasePath: the paths of a document count from its server's address,
// so it names the base path, as do the examples of the reference page.
func TestDocumentBelowABasePath(t *testing.T) {
	r := newLimitedRig(t, func(c *Config) { c.BasePath = "/maps/tectonics" })
	var doc struct {
		Servers []struct{ URL string }
	}
	if err := json.Unmarshal(r.get("/maps/tectonics/openapi.json").Body.Bytes(), &doc); err != nil {
		t.Fatal(err)
	}
	if len(doc.Servers) != 1 || doc.Servers[0].URL != "/maps/tectonics" {
		t.Errorf("servers are %v", doc.Servers)
	}
	page := r.get("/maps/tectonics/reference").Body.String()
	if !strings.Contains(page, "127.0.0.1:8080/maps/tectonics/v1/point?") {
		t.Error("the reference page does not name the base path")
	}
	for _, m := range regexp.MustCompile(`(?:href|src)="([^"#]*)"`).FindAllStringSubmatch(page, -1) {
		if strings.HasPrefix(m[1], "/") {
			t.Errorf("the reference page has a link that leaves the base path: %s", m[1])
			continue
		}
		if w := r.get("/maps/tectonics/" + strings.TrimPrefix(m[1], "./")); w.Code != http.StatusOK {
			t.Errorf("the link %s leads to %d", m[1], w.Code)
		}
	}
}
