package page

import (
	"bytes"
	"fmt"
	"html/template"
	"strings"

	"github.com/tidwall/gjson"
)

// refOp is one operation as the reference page shows it.
type refOp struct {
	ID, Method, Path, Summary string
	Description               []string
	Params                    []refParam
	Body                      []refContent
	Responses                 []refResponse
}

type refParam struct{ Name, In, Type, Default, Example, Description string }

type refContent struct {
	Media   string
	Schema  template.HTML
	Example string
}

type refResponse struct {
	Status, Description string
	Content             []refContent
}

type refGroup struct {
	Name, Description string
	Ops               []refOp
}

type refSchema struct {
	Name, Description string
	Type              template.HTML
	Values            string
	Members           []refMember
}

type refMember struct {
	Name        string
	Type        template.HTML
	Description string
}

type refPage struct {
	Title, Summary string
	Intro          []template.HTML
	Groups         []refGroup
	Schemas        []refSchema
}

// reference makes the reference page from an OpenAPI 3.1 document, in the
// document's own order.
func reference(document []byte) ([]byte, error) {
	if !gjson.ValidBytes(document) {
		return nil, fmt.Errorf("page: the OpenAPI document is not JSON")
	}
	d := refDoc{gjson.ParseBytes(document)}
	p := refPage{Title: d.Get("info.title").String(), Summary: d.Get("info.summary").String()}
	for _, par := range strings.Split(d.Get("info.description").String(), "\n\n") {
		p.Intro = append(p.Intro, bold(par))
	}
	d.Get("tags").ForEach(func(_, tag gjson.Result) bool {
		p.Groups = append(p.Groups, refGroup{Name: tag.Get("name").String(), Description: tag.Get("description").String()})
		return true
	})
	d.Get("paths").ForEach(func(path, item gjson.Result) bool {
		item.ForEach(func(method, op gjson.Result) bool {
			for i := range p.Groups {
				if p.Groups[i].Name == op.Get("tags.0").String() {
					p.Groups[i].Ops = append(p.Groups[i].Ops, d.operation(path.String(), method.String(), op))
				}
			}
			return true
		})
		return true
	})
	d.Get("components.schemas").ForEach(func(name, s gjson.Result) bool {
		p.Schemas = append(p.Schemas, d.schema(name.String(), s))
		return true
	})
	var b bytes.Buffer
	if err := refTemplate.Execute(&b, p); err != nil {
		return nil, fmt.Errorf("page: the reference page: %w", err)
	}
	return b.Bytes(), nil
}

// refDoc is the OpenAPI document.
type refDoc struct{ gjson.Result }

// resolve follows a reference within the document.
func (d refDoc) resolve(v gjson.Result) gjson.Result {
	for range 10 {
		ref := v.Get(`$ref`).String()
		if ref == "" {
			return v
		}
		parts := strings.Split(strings.TrimPrefix(ref, "#/"), "/")
		v = d.Result
		for _, part := range parts {
			v = v.Get(gjson.Escape(part))
		}
	}
	return v
}

func (d refDoc) operation(path, method string, op gjson.Result) refOp {
	o := refOp{ID: op.Get("operationId").String(), Method: strings.ToUpper(method), Path: path, Summary: op.Get("summary").String(), Description: paragraphs(op.Get("description").String())}
	op.Get("parameters").ForEach(func(_, p gjson.Result) bool {
		p = d.resolve(p)
		s := p.Get("schema")
		r := refParam{Name: p.Get("name").String(), In: p.Get("in").String(), Type: plainType(d.resolve(s)), Default: s.Get("default").String(), Description: p.Get("description").String()}
		if p.Get("required").Bool() {
			r.In += ", required"
		}
		if r.Example = p.Get("example").String(); r.Example == "" {
			p.Get("examples").ForEach(func(_, e gjson.Result) bool {
				r.Example = e.Get("value").String()
				return false
			})
		}
		o.Params = append(o.Params, r)
		return true
	})
	o.Body = d.contents(op.Get("requestBody.content"))
	op.Get("responses").ForEach(func(status, r gjson.Result) bool {
		r = d.resolve(r)
		o.Responses = append(o.Responses, refResponse{status.String(), r.Get("description").String(), d.contents(r.Get("content"))})
		return true
	})
	return o
}

func (d refDoc) contents(v gjson.Result) (out []refContent) {
	v.ForEach(func(media, c gjson.Result) bool {
		example := c.Get("example")
		if !example.Exists() {
			c.Get("examples").ForEach(func(_, e gjson.Result) bool {
				example = d.resolve(e).Get("value")
				return false
			})
		}
		text := example.String()
		if example.IsObject() || example.IsArray() {
			text = example.Get("@pretty").Raw
		}
		out = append(out, refContent{media.String(), typeOf(c.Get("schema")), text})
		return true
	})
	return out
}

func (d refDoc) schema(name string, s gjson.Result) refSchema {
	out := refSchema{Name: name, Description: s.Get("description").String(), Type: typeOf(s)}
	var values []string
	for _, v := range s.Get("enum").Array() {
		values = append(values, v.String())
	}
	out.Values = strings.Join(values, ", ")
	s.Get("properties").ForEach(func(member, m gjson.Result) bool {
		text := m.Get("description").String()
		if text == "" {
			text = d.resolve(m).Get("description").String()
		}
		out.Members = append(out.Members, refMember{member.String(), typeOf(m), text})
		return true
	})
	return out
}

func paragraphs(s string) []string {
	if s == "" {
		return nil
	}
	return strings.Split(s, "\n\n")
}

// bold turns **text** into strong text and escapes all else.
func bold(s string) template.HTML {
	parts := strings.Split(s, "**")
	var b strings.Builder
	for i, part := range parts {
		part = template.HTMLEscapeString(part)
		if i%2 == 1 {
			part = "<strong>" + part + "</strong>"
		}
		b.WriteString(part)
	}
	return template.HTML(b.String()) // #nosec G203 -- each part is escaped above
}

// typeOf names a schema's type, with links to the schemas that it refers to.
func typeOf(s gjson.Result) template.HTML {
	if ref := s.Get(`$ref`).String(); ref != "" {
		name := template.HTMLEscapeString(ref[strings.LastIndexByte(ref, '/')+1:])
		return template.HTML(`<a href="#schema-` + name + `">` + name + `</a>`) // #nosec G203 -- the name is escaped above
	}
	for _, key := range []string{"oneOf", "anyOf", "allOf"} {
		var all []string
		for _, v := range s.Get(key).Array() {
			all = append(all, string(typeOf(v)))
		}
		if all != nil {
			return template.HTML(strings.Join(all, " or ")) // #nosec G203 -- parts that typeOf escaped
		}
	}
	if s.Get("type").String() == "array" && s.Get("items").IsObject() {
		return "array of " + typeOf(s.Get("items"))
	}
	return template.HTML(template.HTMLEscapeString(plainType(s))) // #nosec G203 -- escaped here
}

// plainType names the type of a schema that refers to no other, with its range.
func plainType(s gjson.Result) string {
	if c := s.Get("const"); c.Exists() {
		return `"` + c.String() + `"`
	}
	t := s.Get("type").String()
	if list := s.Get("type").Array(); len(list) > 1 {
		var all []string
		for _, v := range list {
			all = append(all, v.String())
		}
		t = strings.Join(all, " or ")
	}
	low, high := s.Get("minimum"), s.Get("maximum")
	switch {
	case low.Exists() && high.Exists():
		t += fmt.Sprintf(", %s to %s", low.Raw, high.Raw)
	case low.Exists():
		t += ", at least " + low.Raw
	}
	return t
}

var refTemplate = template.Must(template.ParseFS(templates, "template/reference.html"))
