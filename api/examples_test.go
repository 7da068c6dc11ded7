package api

import (
	"encoding/json"
	"fmt"
	"net/http"
	"net/url"
	"strings"
	"testing"

	"nearmargin/setting/builtin"
)

// TestExamplesAreAnswered sends every example of the document to the service on the
// built-in model: each parameter's examples to every path that takes it, one at a time
// beside the required ones, and each example of a body.
func TestExamplesAreAnswered(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	r, doc := newRig(t, b.Model), document(t)
	sent := 0
	for path, item := range doc["paths"].(map[string]any) {
		for method, op := range item.(map[string]any) {
			op := op.(map[string]any)
			bodies := examplesOfBody(t, doc, path, method)
			base, optional, target := url.Values{}, map[string][]string{}, path
			list, _ := op["parameters"].([]any)
			for _, p := range list {
				name := strings.TrimPrefix(p.(map[string]any)["$ref"].(string), "#/components/parameters/")
				p := at(t, doc, "components", "parameters", name)
				examples := examplesOf(p)
				name = p["name"].(string)
				switch {
				case p["in"] == "path":
					target = strings.ReplaceAll(target, "{"+name+"}", examples[0])
				case p["required"] == true:
					base.Set(name, examples[0])
					optional[name] = examples
				default:
					optional[name] = examples
				}
			}
			queries := []url.Values{base}
			for name, examples := range optional {
				if strings.HasSuffix(name, "_column") || strings.HasPrefix(name, "depth_") && method == "post" {
					continue // they name columns of the caller's own table; the tests of batches send them
				}
				for _, e := range examples {
					q := url.Values{name: {e}}
					for k, v := range base {
						if k != name {
							q[k] = v
						}
					}
					queries = append(queries, q)
				}
			}
			for _, q := range queries {
				for _, body := range bodies {
					w := r.ask(strings.ToUpper(method), target+"?"+q.Encode(), body.media, body.text)
					sent++
					if w.Code != http.StatusOK {
						t.Errorf("%s %s?%s: status %d: %s", method, target, q.Encode(), w.Code, w.Body)
					}
				}
			}
		}
	}
	if sent < 60 {
		t.Errorf("only %d examples were sent", sent)
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

type exampleBody struct{ media, text string }

// examplesOfBody returns the examples of an operation's body; one empty body where it
// takes none.
func examplesOfBody(t *testing.T, doc map[string]any, path, method string) (out []exampleBody) {
	t.Helper()
	op := at(t, doc, "paths", path, method)
	if op["requestBody"] == nil {
		return []exampleBody{{}}
	}
	for media, content := range at(t, doc, "paths", path, method, "requestBody", "content") {
		content := content.(map[string]any)
		var examples []any
		if e, ok := content["example"]; ok {
			examples = append(examples, e)
		}
		list, _ := content["examples"].(map[string]any)
		for _, e := range list {
			examples = append(examples, e.(map[string]any)["value"])
		}
		if examples == nil {
			t.Errorf("%s %s: the body %s has no example", method, path, media)
		}
		for _, e := range examples {
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
