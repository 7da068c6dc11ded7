package api

import (
	"encoding/json"
	"fmt"
	"net/http"
	"net/http/httptest"
	"net/url"
	"os"
	"slices"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/tidwall/gjson"

	"nearmargin/setting/builtin"
)

// operation is one operation of the document, with the requests that its examples make.
type operation struct {
	path, method, target string // the target has the examples of the path's own parameters
	id                   string
	required             url.Values
	optional             map[string][]string // examples of every parameter of the query
	bodies               []exampleBody       // one empty body where it takes none
	responses            map[string]any
	hasModel             bool
}

type exampleBody struct{ media, text string }

// operations reads them from the document, in the order of their ids.
func operations(t *testing.T, doc map[string]any) (out []operation) {
	t.Helper()
	for path, item := range doc["paths"].(map[string]any) {
		for method := range item.(map[string]any) {
			op := at(t, doc, "paths", path, method)
			o := operation{path: path, method: strings.ToUpper(method), target: path, id: op["operationId"].(string),
				required: url.Values{}, optional: map[string][]string{}, responses: op["responses"].(map[string]any), bodies: examplesOfBody(t, doc, path, method)}
			for _, p := range op["parameters"].([]any) {
				p := at(t, doc, "components", "parameters", strings.TrimPrefix(p.(map[string]any)["$ref"].(string), "#/components/parameters/"))
				examples, name := examplesOf(p), p["name"].(string)
				switch {
				case p["in"] == "path":
					o.target = strings.ReplaceAll(o.target, "{"+name+"}", examples[0])
				case p["in"] == "query":
					if p["required"] == true {
						o.required.Set(name, examples[0])
					}
					o.optional[name] = examples
				}
			}
			_, o.hasModel = o.optional["model"]
			out = append(out, o)
		}
	}
	slices.SortFunc(out, func(a, b operation) int { return strings.Compare(a.id, b.id) })
	return out
}

// query is the required parameters with some of them set otherwise or more.
func (o *operation) query(pairs ...string) string {
	q := url.Values{}
	for k, v := range o.required {
		q[k] = v
	}
	for i := 0; i < len(pairs); i += 2 {
		q.Set(pairs[i], pairs[i+1])
	}
	if len(q) == 0 {
		return o.target
	}
	return o.target + "?" + q.Encode()
}

// request is a request for the operation's first example.
func (o *operation) request(pairs ...string) *http.Request {
	req := httptest.NewRequest(o.method, o.query(pairs...), strings.NewReader(o.bodies[0].text))
	if m := o.bodies[0].media; m != "" {
		req.Header.Set("Content-Type", m)
	}
	return req
}

// TestExamplesAreAnswered sends every example of the document to the service on the
// built-in model: each parameter's examples to every path that takes it, one at a time
// beside the required ones, and each example of a body.
func TestExamplesAreAnswered(t *testing.T) {
	r, sent := builtinRig(t), 0
	for _, o := range operations(t, document(t)) {
		targets := []string{o.query()}
		for name, examples := range o.optional {
			if o.id == "annotate" && (strings.HasSuffix(name, "_column") || strings.HasPrefix(name, "depth_")) {
				continue // they name columns; TestColumnExamplesAreAnswered sends them
			}
			for _, e := range examples {
				targets = append(targets, o.query(name, e))
			}
		}
		for _, target := range targets {
			for _, body := range o.bodies {
				w := r.ask(o.method, target, body.media, body.text)
				sent++
				if w.Code != http.StatusOK {
					t.Errorf("%s %s: status %d: %s", o.method, target, w.Code, w.Body)
				}
			}
		}
	}
	if sent < 60 {
		t.Errorf("only %d examples were sent", sent)
	}
}

// TestColumnExamplesAreAnswered sends the examples of parameters that name a column, or
// say how one is read, with a table that has such columns; some need one another.
func TestColumnExamplesAreAnswered(t *testing.T) {
	const (
		table   = "lon,lat,X,Y,hypocentre_km,ground_m,h_error_km\n-72.4,-36.1,-72.4,-36.1,25,1,2\n"
		feature = `{"type":"Feature","properties":null,"geometry":{"type":"Point","coordinates":[-72.4,-36.1,25]}}`
	)
	beside := map[string][]string{
		"lon_column": {"lat_column", "Y"}, "lat_column": {"lon_column", "X"},
		"depth_unit":       {"depth_column", "hypocentre_km"},
		"depth_datum":      {"depth_column", "hypocentre_km", "elevation_column", "ground_m"},
		"elevation_column": {"depth_column", "hypocentre_km", "depth_datum", "ground"},
	}
	r, sent := builtinRig(t), 0
	for _, o := range operations(t, document(t)) {
		for name, examples := range o.optional {
			if o.id != "annotate" || !strings.HasSuffix(name, "_column") && !strings.HasPrefix(name, "depth_") {
				continue
			}
			for _, e := range examples {
				media, body := "text/csv", table
				if e == "@z" {
					media, body = "application/geo+json", feature
				}
				w := r.ask(o.method, o.query(append(beside[name], name, e)...), media, body)
				sent++
				if w.Code != http.StatusOK || w.Result().Trailer.Get("Nearmargin-Row-Errors") != "0" {
					t.Errorf("%s=%s: status %d: %s", name, e, w.Code, w.Body)
				}
				if strings.HasPrefix(name, "depth_") && !strings.Contains(w.Body.String(), "above") && !strings.Contains(w.Body.String(), "near_interface") && !strings.Contains(w.Body.String(), "below") {
					t.Errorf("%s=%s: no depth was read: %s", name, e, w.Body)
				}
			}
		}
	}
	if sent != 8 {
		t.Errorf("%d examples were sent, want 8", sent)
	}
}

func builtinRig(t *testing.T) *rig {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	return newRig(t, b.Model)
}

// TestAnswersAreTheExamples compares the example of each answer with what the service
// says to the examples of that operation's request, on the built-in model. After a
// change of the model, -update writes them anew.
func TestAnswersAreTheExamples(t *testing.T) {
	r, doc, c := builtinRig(t), document(t), compiler(t)
	// too long to read, or of more than the model
	without := []string{"section", "sectionSVG", "boundaries", "slabs", "zones", "hotspots", "plates", "models", "metrics", "openapi", "mapPage", "referencePage", "asset"}
	for _, o := range operations(t, doc) {
		for media, content := range at(t, doc, "paths", o.path, strings.ToLower(o.method), "responses", "200", "content") {
			_, has := content.(map[string]any)["example"]
			if none := slices.Contains(without, o.id); has == none {
				t.Errorf("%s %s: there is an example: %v", o.id, media, has)
				continue
			} else if none {
				continue
			}
			body := o.bodies[0]
			for _, b := range o.bodies {
				if o.path == "/v1/annotate" && b.media == media {
					body = b
				}
			}
			w := r.ask(o.method, o.query(), body.media, body.text)
			if w.Code != http.StatusOK || w.Header().Get("Content-Type") != media {
				t.Errorf("%s %s: status %d, type %s", o.id, media, w.Code, w.Header().Get("Content-Type"))
				continue
			}
			at := []string{"paths", o.path, strings.ToLower(o.method), "responses", "200", "content", media}
			got := w.Body.String()
			if !strings.Contains(media, "json") || media == "application/x-ndjson" {
				raw, err := json.Marshal(got)
				if err != nil {
					t.Fatal(err)
				}
				got = string(raw)
			}
			isExample(t, append(at, "example"), got)
			s, err := c.Compile(documentURL + "#/" + pointerTo(append(at, "schema")))
			if err != nil {
				t.Fatal(err)
			}
			v, err := jsonschema.UnmarshalJSON(strings.NewReader(got))
			if err != nil {
				t.Fatal(err)
			}
			if err := s.Validate(v); err != nil {
				t.Errorf("%s %s: %v", o.id, media, err)
			}
		}
	}
}

// pointerTo is the JSON pointer to a place, as part of an address.
func pointerTo(path []string) string {
	var parts []string
	for _, p := range path {
		parts = append(parts, url.PathEscape(strings.NewReplacer("~", "~0", "/", "~1").Replace(p)))
	}
	return strings.Join(parts, "/")
}

// isExample compares JSON with what stands at a place of the document; with -update
// it writes it there.
func isExample(t *testing.T, path []string, got string) {
	t.Helper()
	raw := OpenAPI()
	if *update {
		var err error
		if raw, err = os.ReadFile("openapi.json"); err != nil {
			t.Fatal(err)
		}
	}
	var escaped []string
	for _, p := range path {
		escaped = append(escaped, gjson.Escape(p))
	}
	want := gjson.GetBytes(raw, strings.Join(escaped, "."))
	if !want.Exists() || want.Index == 0 {
		t.Fatalf("openapi.json has nothing at %v", path)
	}
	if want.Get("@ugly").Raw == gjson.Get(got, "@ugly").Raw {
		return
	}
	if !*update {
		t.Errorf("openapi.json, %s: the example is not what the service says (write it anew with -update)\n got: %s\nwant: %s", strings.Join(path, "/"), got, want.Raw)
		return
	}
	text := got
	if v := gjson.Parse(got); v.IsObject() || v.IsArray() {
		text = strings.TrimSpace(v.Get(`@pretty:{"width":120}`).Raw)
		text = strings.ReplaceAll(text, "\n", "\n"+strings.Repeat("  ", len(path)))
	}
	out := string(raw[:want.Index]) + text + string(raw[want.Index+len(want.Raw):])
	if err := os.WriteFile("openapi.json", []byte(out), 0o644); err != nil {
		t.Fatal(err)
	}
}

// examplesOf returns a parameter's examples as they stand in a query.
func examplesOf(p map[string]any) (out []string) {
	if e, ok := p["example"]; ok {
		out = append(out, fmt.Sprint(e))
	}
	list, _ := p["examples"].(map[string]any)
	for _, e := range list {
		out = append(out, fmt.Sprint(e.(map[string]any)["value"]))
	}
	return out
}

// examplesOfBody returns the examples of an operation's body, each media type's in the
// order of their names; one empty body where it takes none.
func examplesOfBody(t *testing.T, doc map[string]any, path, method string) (out []exampleBody) {
	t.Helper()
	op := at(t, doc, "paths", path, method)
	if op["requestBody"] == nil {
		return []exampleBody{{}}
	}
	contents := at(t, doc, "paths", path, method, "requestBody", "content")
	c := compiler(t)
	for _, media := range sortedNames(contents) {
		content := contents[media].(map[string]any)
		var examples []any
		if e, ok := content["example"]; ok {
			examples = append(examples, e)
		}
		list, _ := content["examples"].(map[string]any)
		for _, name := range sortedNames(list) {
			examples = append(examples, list[name].(map[string]any)["value"])
		}
		if examples == nil {
			t.Errorf("%s %s: the body %s has no example", method, path, media)
		}
		s, err := c.Compile(documentURL + "#/" + pointerTo([]string{"paths", path, method, "requestBody", "content", media, "schema"}))
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range examples {
			if err := s.Validate(e); err != nil {
				t.Errorf("%s %s: the example of %s: %v", method, path, media, err)
			}
			text, ok := e.(string)
			if !ok {
				raw, err := json.Marshal(e)
				if err != nil {
					t.Fatal(err)
				}
				text = string(raw)
			}
			out = append(out, exampleBody{media, text})
		}
	}
	return out
}

func sortedNames(m map[string]any) (out []string) {
	for name := range m {
		out = append(out, name)
	}
	slices.Sort(out)
	return out
}
