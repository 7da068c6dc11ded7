package page

import (
	"bytes"
	"fmt"
	"html/template"
	"net/url"
	"slices"
	"strings"

	"github.com/tidwall/gjson"
)

// refOp is one operation as the reference page shows it.
type refOp struct {
	ID, Method, Path, Summary string
	Description               []string
	Command                   string // a request by curl; "" where a browser asks
	Params                    []refParam
	HeaderParams              []string
	Token                     bool // where there are tokens, it needs one
	Body                      []refContent
	Responses                 []refResponse
}

type refParam struct {
	Name, In, Type, Default, Description string
	Required                             bool
	Examples                             []string
}

type refContent struct {
	Media    string
	Schema   template.HTML
	Note     string // the description of a schema without a name
	Examples []refExample
	Problems []string
}

type refExample struct{ Name, Summary, Text string }

type refResponse struct {
	Status, Description string
	Content             []refContent
	Headers             []string
}

type refGroup struct {
	Name, Description string
	Ops               []refOp
}

type refSchema struct {
	Name, Description string
	Type              template.HTML // "" where the members say it
	Values            []string
	Members           []refMember
}

type refMember struct {
	Name                 string
	Type                 template.HTML
	Description, Example string
	May                  bool // be absent
}

type refPage struct {
	Title, Summary string
	Intro          []template.HTML
	Groups         []refGroup
	Headers        []refSchema
	Problems       []refExample
	Schemas        []refSchema
}

// reference makes the reference page from an OpenAPI 3.1 document, in the
// document's own order.
func reference(document []byte) ([]byte, error) {
	if !gjson.ValidBytes(document) {
		return nil, fmt.Errorf("page: the OpenAPI document is not JSON")
	}
	d := refDoc{Result: gjson.ParseBytes(document)}
	d.service = "http://127.0.0.1:8080" + strings.TrimSuffix(d.Get("servers.0.url").String(), "/")
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
	p.Headers = d.headers()
	d.Get("components.examples").ForEach(func(name, e gjson.Result) bool {
		p.Problems = append(p.Problems, refExample{name.String(), e.Get("summary").String(), text(e.Get("value"))})
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
type refDoc struct {
	gjson.Result
	service string // the address of a service with this document, for examples
}

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
	o := refOp{ID: op.Get("operationId").String(), Method: strings.ToUpper(method), Path: path, Summary: op.Get("summary").String(), Description: paragraphs(op.Get("description").String()), Token: op.Get("security").Exists()}
	op.Get("parameters").ForEach(func(_, p gjson.Result) bool {
		p = d.resolve(p)
		s := p.Get("schema")
		r := refParam{Name: p.Get("name").String(), In: p.Get("in").String(), Type: plainType(d.resolve(s)), Default: s.Get("default").String(), Description: p.Get("description").String(), Required: p.Get("required").Bool()}
		for _, e := range d.examples(p, "") {
			r.Examples = append(r.Examples, e.Text)
		}
		if r.In == "header" {
			o.HeaderParams = append(o.HeaderParams, r.Name)
		} else {
			o.Params = append(o.Params, r)
		}
		return true
	})
	o.Body = d.contents(op.Get("requestBody.content"), "An example of the body")
	op.Get("responses").ForEach(func(status, r gjson.Result) bool {
		r = d.resolve(r)
		out := refResponse{Status: status.String(), Description: r.Get("description").String(), Content: d.contents(r.Get("content"), "An example of the answer")}
		if out.Status == "default" {
			out.Status = "other"
		}
		r.Get("headers").ForEach(func(name, _ gjson.Result) bool {
			if name.String() != "X-Request-Id" { // every answer has it; the section on headers says so
				out.Headers = append(out.Headers, name.String())
			}
			return true
		})
		o.Responses = append(o.Responses, out)
		return true
	})
	if op.Get("tags.0").String() != "pages" {
		o.Command = d.command(&o)
	}
	return o
}

// command is a request by curl for the first examples of an operation.
func (d refDoc) command(o *refOp) string {
	target, query := d.service+o.Path, ""
	for _, p := range o.Params {
		switch {
		case p.In == "path":
			target = strings.ReplaceAll(target, "{"+p.Name+"}", p.Examples[0])
		case p.Required:
			query += "&" + p.Name + "=" + strings.ReplaceAll(url.QueryEscape(p.Examples[0]), "%2C", ",")
		}
	}
	if query != "" {
		target += "?" + query[1:]
	}
	if o.Body == nil {
		return "curl -s '" + target + "'"
	}
	return "curl -s -H 'Content-Type: " + o.Body[0].Media + "' --data-binary @FILE '" + target + "'"
}

func (d refDoc) contents(v gjson.Result, what string) (out []refContent) {
	v.ForEach(func(media, c gjson.Result) bool {
		r := refContent{Media: media.String(), Schema: typeOf(c.Get("schema")), Note: strings.TrimSuffix(c.Get("schema.description").String(), ".")}
		if r.Media == "application/problem+json" {
			c.Get("examples").ForEach(func(kind, _ gjson.Result) bool {
				r.Problems = append(r.Problems, kind.String())
				return true
			})
			r.Schema = "" // the section on problems says it once
		} else {
			r.Examples = d.examples(c, what)
		}
		out = append(out, r)
		return true
	})
	return out
}

// examples are those of a parameter or a body.
func (d refDoc) examples(v gjson.Result, what string) (out []refExample) {
	if e := v.Get("example"); e.Exists() {
		out = append(out, refExample{Name: what, Text: text(e)})
	}
	v.Get("examples").ForEach(func(_, e gjson.Result) bool {
		e = d.resolve(e)
		out = append(out, refExample{Name: what, Summary: e.Get("summary").String(), Text: text(e.Get("value"))})
		return true
	})
	return out
}

// text is an example as a reader sees it: JSON with line breaks, anything else as it is.
func text(v gjson.Result) string {
	if v.IsObject() || v.IsArray() {
		return strings.TrimSpace(v.Get(`@pretty:{"width":100}`).Raw)
	}
	return v.String()
}

// headers lists the headers of requests and answers by name.
func (d refDoc) headers() (out []refSchema) {
	add := func(name, in string, h gjson.Result) {
		i := slices.IndexFunc(out, func(s refSchema) bool { return s.Name == name })
		if i < 0 {
			i, out = len(out), append(out, refSchema{Name: name})
		}
		out[i].Members = append(out[i].Members, refMember{Name: in, Description: h.Get("description").String(), Example: h.Get("example").String()})
	}
	d.Get("components.parameters").ForEach(func(_, p gjson.Result) bool {
		if p.Get("in").String() == "header" {
			add(p.Get("name").String(), "request", p)
		}
		return true
	})
	d.Get("components.headers").ForEach(func(name, h gjson.Result) bool {
		add(name.String(), "answer", h)
		return true
	})
	return out
}

func (d refDoc) schema(name string, s gjson.Result) refSchema {
	out := refSchema{Name: name, Description: s.Get("description").String()}
	for _, v := range s.Get("enum").Array() {
		out.Values = append(out.Values, v.String())
	}
	out.Members = d.members("", s)
	if out.Members == nil && out.Values == nil {
		out.Type = typeOf(s)
	}
	return out
}

// members lists the members of an object, with those of objects within it that have no
// name of their own.
func (d refDoc) members(prefix string, s gjson.Result) (out []refMember) {
	required := map[string]bool{}
	for _, v := range s.Get("required").Array() {
		required[v.String()] = true
	}
	s.Get("properties").ForEach(func(member, m gjson.Result) bool {
		says := m.Get("description").String()
		if says == "" {
			says = d.resolve(m).Get("description").String()
		}
		out = append(out, refMember{Name: prefix + member.String(), Type: typeOf(m), Description: says, May: !required[member.String()]})
		out = append(out, d.members(prefix+member.String()+".", m)...)
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

// plainType names the type of a schema that refers to no other, with its range or values.
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
	if values := s.Get("enum").Array(); len(values) > 0 {
		var all []string
		for _, v := range values {
			all = append(all, v.String())
		}
		return t + ": " + strings.Join(all, ", ")
	}
	low, high, above, below := s.Get("minimum"), s.Get("maximum"), s.Get("exclusiveMinimum"), s.Get("exclusiveMaximum")
	switch {
	case low.Exists() && high.Exists():
		t += ", " + low.Raw + " to " + high.Raw
	case low.Exists() && below.Exists():
		t += ", " + low.Raw + " to less than " + below.Raw
	case above.Exists() && high.Exists():
		t += ", more than " + above.Raw + ", at most " + high.Raw
	case low.Exists():
		t += ", at least " + low.Raw
	}
	if pattern := s.Get("pattern"); pattern.Exists() {
		t += ", of the form " + pattern.String()
	}
	return t
}

var refTemplate = template.Must(template.ParseFS(templates, "template/reference.html"))
