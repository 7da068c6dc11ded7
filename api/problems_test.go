package api

import (
	"bufio"
	"encoding/json"
	"go/ast"
	"go/parser"
	"go/token"
	"io"
	"maps"
	"net"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/access"
	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
)

// TestProblemKindsMatchTheDocument compares the types of problems that the document
// lists, and its examples, with the constants of type problemKind, and sees to it that
// the code names a kind by its constant alone.
func TestProblemKindsMatchTheDocument(t *testing.T) {
	files, err := filepath.Glob("*.go")
	if err != nil {
		t.Fatal(err)
	}
	var want []string
	calls := 0
	for _, name := range files {
		if strings.HasSuffix(name, "_test.go") {
			continue
		}
		file, err := parser.ParseFile(token.NewFileSet(), name, nil, 0)
		if err != nil {
			t.Fatal(err)
		}
		ast.Inspect(file, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.ValueSpec:
				if kind, ok := n.Type.(*ast.Ident); ok && kind.Name == "problemKind" {
					text, err := strconv.Unquote(n.Values[0].(*ast.BasicLit).Value)
					if err != nil {
						t.Fatal(err)
					}
					want = append(want, text)
				}
			case *ast.CallExpr:
				f, ok := n.Fun.(*ast.Ident)
				if !ok {
					return true
				}
				i, makes := map[string]int{"newProblem": 1, "refuse": 1, "overload": 0}[f.Name]
				if !makes {
					return true
				}
				calls++
				if arg, ok := n.Args[i].(*ast.Ident); !ok || !strings.HasPrefix(arg.Name, "kind") {
					t.Errorf("%s: a problem is made of a kind without a constant", name)
				}
			}
			return true
		})
	}
	if calls < 15 {
		t.Errorf("only %d problems are made", calls)
	}
	doc := document(t)
	var listed []string
	for _, v := range at(t, doc, "components", "schemas", "Problem", "properties", "type")["enum"].([]any) {
		listed = append(listed, strings.TrimPrefix(v.(string), problemType))
	}
	examples := sortedNames(at(t, doc, "components", "examples"))
	slices.Sort(want)
	slices.Sort(listed)
	if !slices.Equal(want, listed) || !slices.Equal(want, examples) {
		t.Errorf("the code knows %v\nthe document lists %v\nand has examples of %v", want, listed, examples)
	}
}

// slowBody is a body that does not come.
type slowBody struct{}

func (slowBody) Read([]byte) (int, error) { return 0, os.ErrDeadlineExceeded }

// provocation is a way to be refused that any operation can be asked in.
type provocation struct {
	name   string // of the response of the document
	kind   problemKind
	status int
	config func(*Config) // nil: as it is
	before func(*testing.T, *rig)
	change func(*http.Request)
	pairs  []string // set in the query
	target string   // in place of the operation's own
}

func body(media string, text func() io.Reader) func(*http.Request) {
	return func(r *http.Request) {
		r.Header.Set("Content-Type", media)
		r.Body = io.NopCloser(text())
	}
}

func provocations(t *testing.T) []provocation {
	bowtie := func() io.Reader {
		return strings.NewReader(`{"type":"Polygon","coordinates":[[[0,0],[10,10],[10,0],[0,10],[0,0]]]}`)
	}
	withTokens := func(c *Config) { c.Access.Tokens = tokens(t) }
	return []provocation{
		{name: "BadRequest", kind: kindInvalid, status: 400, pairs: []string{"no_such", "1"}},
		{name: "NeedsToken", kind: kindToken, status: 401, config: withTokens},
		{name: "Scope", kind: kindScope, status: 403, config: withTokens, change: func(r *http.Request) {
			r.Header.Set("Authorization", "Bearer q-secret")
			if r.URL.Path != "/v1/annotate" {
				r.Header.Set("Authorization", "Bearer o-secret")
			}
		}},
		{name: "NoSuchModel", kind: kindNoModel, status: 404, pairs: []string{"model", "mine"}},
		{name: "NoSuchModel", kind: kindNoModel, status: 404, target: "/v1/models/mine"},
		{name: "NoSuchFile", kind: kindNotFound, status: 404, target: "/assets/mine"},
		{name: "TooSlow", kind: kindSlow, status: 408, change: body("application/json", func() io.Reader { return slowBody{} })},
		{name: "TooLarge", kind: kindLarge, status: 413, config: func(c *Config) { c.Limits.BodyBytes = 2000 }, change: body("application/json", func() io.Reader { return strings.NewReader("[" + strings.Repeat(" ", 3000)) })},
		{name: "Unsupported", kind: kindMedia, status: 415, change: func(r *http.Request) { r.Header.Set("Content-Type", "application/pdf") }},
		{name: "Impossible", kind: kindImpossible, status: 422, change: body("application/geo+json", bowtie), pairs: []string{"bbox", "10,10,10,20"}},
		{name: "NoSlab", kind: kindNoSlab, status: 422, pairs: []string{"lon", "-30", "lat", "20"}},
		{name: "TooMany", kind: kindRate, status: 429, config: func(c *Config) { c.Access.Rate = access.NewLimiter(0.01, 1, nil) }, before: func(_ *testing.T, r *rig) {
			r.get("/v1/plates")
		}},
		{name: "Busy", kind: kindManyBatches, status: 503, config: func(c *Config) { c.Limits.Batches = 1 }, before: func(t *testing.T, r *rig) {
			if _, err := r.gate.enter(); err != nil {
				t.Fatal(err)
			}
		}},
		{name: "BusyAreas", kind: kindManyAreas, status: 503, config: func(c *Config) { c.Limits.Areas = 1 }, before: func(_ *testing.T, r *rig) {
			r.areas <- struct{}{}
		}},
		{name: "Draining", kind: kindDraining, status: 503, before: func(_ *testing.T, r *rig) { r.Drain() }},
	}
}

// TestEveryStatusIsDescribed asks every operation in every way to be refused. What it
// says is described at that operation, and what is described there is said.
func TestEveryStatusIsDescribed(t *testing.T) {
	doc, problemSchema := document(t), schema(t, "Problem")
	all := operations(t, doc)
	met := map[string]map[string]bool{}
	for _, p := range provocations(t) {
		r := newLimitedRig(t, func(c *Config) {
			if p.config != nil {
				p.config(c)
			}
		})
		if p.before != nil {
			p.before(t, r)
		}
		for _, o := range all {
			o = forModel(o)
			if p.target != "" {
				if o.path[:strings.IndexByte(o.path+"{", '{')] != p.target[:strings.LastIndexByte(p.target, '/')+1] {
					continue // for another operation
				}
				o.target = p.target
			}
			var pairs []string
			for i := 0; i < len(p.pairs); i += 2 {
				if _, takes := o.optional[p.pairs[i]]; takes || p.pairs[i] == "no_such" {
					pairs = append(pairs, p.pairs[i], p.pairs[i+1])
				}
			}
			req := o.request(pairs...)
			if p.change != nil {
				p.change(req)
			}
			w := httptest.NewRecorder()
			r.ServeHTTP(w, req)
			response, described := o.responses[strconv.Itoa(w.Code)].(map[string]any)
			if !described {
				t.Errorf("%s: %s gives %d, which is not described: %.200s", o.id, p.name, w.Code, w.Body)
				continue
			}
			if w.Code == http.StatusOK {
				continue
			}
			got := problem(t, w)
			ref := strings.TrimPrefix(response["$ref"].(string), "#/components/responses/")
			examples := at(t, doc, "components", "responses", ref, "content", "application/problem+json", "examples")
			if examples[strings.TrimPrefix(got.Type, problemType)] == nil {
				t.Errorf("%s: %d is of type %s, of which the response %s has no example", o.id, w.Code, got.Type, ref)
			}
			raw, err := json.Marshal(got)
			if err != nil {
				t.Fatal(err)
			}
			valid(t, problemSchema, o.id+" "+p.name, raw)
			compareHeaders(t, doc, o.id, at(t, doc, "components", "responses", ref), w.Header())
			if met[o.id] == nil {
				met[o.id] = map[string]bool{}
			}
			met[o.id][strconv.Itoa(w.Code)] = true
		}
	}
	for _, o := range all {
		for _, status := range slices.Sorted(maps.Keys(o.responses)) {
			if status != "200" && status != "304" && status != "default" && !met[o.id][status] {
				t.Errorf("%s: %s is described and was not met", o.id, status)
			}
		}
		_, guarded := scopes[strings.ReplaceAll(o.path, "{id}", ":id")]
		if _, says := at(t, doc, "paths", o.path, strings.ToLower(o.method))["security"]; says != guarded {
			t.Errorf("%s: needs a token where there are tokens: %v, described: %v", o.id, guarded, says)
		}
	}
}

// forModel gives the operation examples that are of the made-up model and reach its slab.
func forModel(o operation) operation {
	o.target = strings.Replace(o.target, "/v1/models/builtin", "/v1/models/"+testmodel.ID, 1)
	if o.path == "/v1/section" || o.path == "/v1/section.svg" {
		o.required = map[string][]string{"lon": {"62.2"}, "lat": {"-5"}}
	}
	return o
}

// TestHeadersAreDescribed compares the headers of every operation's answer, and of 304
// where there is an ETag, with those described.
func TestHeadersAreDescribed(t *testing.T) {
	doc, r := document(t), newRig(t)
	for _, o := range operations(t, doc) {
		o := forModel(o)
		w := httptest.NewRecorder()
		r.ServeHTTP(w, o.request())
		if w.Code != http.StatusOK {
			t.Errorf("%s: status %d: %s", o.id, w.Code, w.Body)
			continue
		}
		compareHeaders(t, doc, o.id, o.responses["200"].(map[string]any), w.Header())
		_, says := o.responses["304"]
		etag := w.Header().Get("ETag")
		if says != (etag != "") {
			t.Errorf("%s: ETag %q, 304 is described: %v", o.id, etag, says)
		}
		if etag == "" {
			continue
		}
		req := o.request()
		req.Header.Set("If-None-Match", etag)
		w = httptest.NewRecorder()
		r.ServeHTTP(w, req)
		if w.Code != http.StatusNotModified || w.Body.Len() > 0 {
			t.Errorf("%s: status %d with the ETag, %d bytes", o.id, w.Code, w.Body.Len())
		}
		if says {
			compareHeaders(t, doc, o.id+" 304", at(t, doc, "paths", o.path, "get", "responses", "304"), w.Header())
		}
	}
}

// compareHeaders compares the headers of an answer with those of a described response.
// Those of the body and those that the document speaks of once for all do not count;
// Vary is absent where there is nothing to say.
func compareHeaders(t *testing.T, doc map[string]any, what string, response map[string]any, got http.Header) {
	t.Helper()
	described := map[string]bool{}
	list, _ := response["headers"].(map[string]any)
	for name, h := range list {
		described[http.CanonicalHeaderKey(name)] = true
		at(t, doc, strings.Split(strings.TrimPrefix(h.(map[string]any)["$ref"].(string), "#/"), "/")...)
		if got.Get(name) == "" && name != "Vary" {
			t.Errorf("%s: the header %s is described and not sent", what, name)
		}
	}
	for name := range got {
		switch name {
		case "Content-Type", "Content-Length", "Content-Encoding", "X-Content-Type-Options", "Connection", "Nearmargin-Rows", "Nearmargin-Row-Errors":
			continue
		}
		if !described[name] {
			t.Errorf("%s: the header %s is sent and not described", what, name)
		}
	}
}

// TestProblemsAreTheExamples provokes a problem of every kind on the built-in model and
// compares it, whole, with the document's example.
func TestProblemsAreTheExamples(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	rigFor := func(change func(*Config)) *rig {
		return newLimitedRig(t, func(c *Config) {
			c.Models = shelf([]*setting.Model{b.Model})
			if change != nil {
				change(c)
			}
		})
	}
	s := schema(t, "Problem")
	met := map[problemKind]bool{}
	check := func(kind problemKind, status int, got []byte) {
		t.Helper()
		p := valid(t, s, string(kind), got)
		if p["type"] != problemType+string(kind) || p["status"] != json.Number(strconv.Itoa(status)) {
			t.Errorf("%s: %s", kind, got)
			return
		}
		if _, says := p["errors"]; says != (status != 500) {
			t.Errorf("%s has errors: %v", kind, says)
		}
		isExample(t, []string{"components", "examples", string(kind), "value"}, string(got))
		met[kind] = true
	}
	point := operation{method: "GET", target: "/v1/point", required: map[string][]string{"lon": {"-72.4"}, "lat": {"95"}}, bodies: []exampleBody{{}}}
	ask := func(r *rig, req *http.Request) []byte {
		w := httptest.NewRecorder()
		r.ServeHTTP(w, req)
		return w.Body.Bytes()
	}
	check(kindInvalid, 400, ask(rigFor(nil), point.request()))
	batch := operation{method: "POST", target: "/v1/annotate", bodies: []exampleBody{{"text/csv", "lon,lat\n"}}}
	box := operation{method: "POST", target: "/v1/area", bodies: []exampleBody{{"application/geo+json", "{}"}}}
	section := operation{method: "GET", target: "/v1/section", required: map[string][]string{"lon": {"-30"}, "lat": {"20"}}, bodies: []exampleBody{{}}}
	for _, p := range provocations(t) {
		o := batch
		switch p.name {
		case "BadRequest", "NoSuchFile":
			continue
		case "NoSuchModel", "NeedsToken", "TooMany":
			o = point
			o.required = map[string][]string{"lon": {"-72.4"}, "lat": {"-36.1"}}
			if p.name == "TooMany" {
				now := time.Now()
				p.config = func(c *Config) { c.Access.Rate = access.NewLimiter(10, 50, func() time.Time { return now }) }
				p.before = func(_ *testing.T, r *rig) {
					for range 50 {
						r.get("/v1/plates")
					}
				}
			}
		case "Impossible":
			o, p.pairs = box, nil
		case "TooLarge":
			o, p.config, p.change = box, nil, body("application/geo+json", func() io.Reader { return strings.NewReader(strings.Repeat(" ", 4<<20+1)) })
		case "NoSlab":
			o = section
		case "BusyAreas":
			o, p.config = box, nil
			p.before = func(_ *testing.T, r *rig) {
				for range DefaultLimits.Areas {
					r.areas <- struct{}{}
				}
			}
		case "Busy":
			p.config = nil
			p.before = func(t *testing.T, r *rig) {
				for range DefaultLimits.Batches {
					if _, err := r.gate.enter(); err != nil {
						t.Fatal(err)
					}
				}
			}
		}
		if p.target != "" {
			continue
		}
		r := rigFor(p.config)
		if p.before != nil {
			p.before(t, r)
		}
		req := o.request(p.pairs...)
		if p.change != nil {
			p.change(req)
		}
		check(p.kind, p.status, ask(r, req))
	}
	r := rigFor(nil)
	r.echo.GET("/defect", func(echo.Context) error { panic("a defect") })
	check(kindNotFound, 404, ask(r, httptest.NewRequest("GET", "/v2/point", nil)))
	check(kindMethod, 405, ask(r, httptest.NewRequest("DELETE", "/v1/point", nil)))
	check(kindInternal, 500, ask(r, httptest.NewRequest("GET", "/defect", nil)))
	for kind, head := range map[problemKind]string{
		kindExpectation: "GET /healthz HTTP/1.1\r\nHost: x\r\nExpect: a-miracle\r\n\r\n",
		kindLongHeader:  "GET /healthz HTTP/1.1\r\nHost: x\r\nX-Long: " + strings.Repeat("x", 80<<10) + "\r\n\r\n",
	} {
		status, text := overTheWire(t, r, head)
		check(kind, status, text)
	}
	for _, kind := range sortedNames(at(t, document(t), "components", "examples")) {
		if !met[problemKind(kind)] {
			t.Errorf("%s was not met", kind)
		}
	}
}

// overTheWire sends bytes to a server and returns the status and the body it gives.
func overTheWire(t *testing.T, r *rig, request string) (int, []byte) {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	srv := &http.Server{Handler: r, MaxHeaderBytes: r.cfg.Limits.HeaderBytes}
	done := make(chan error, 1)
	go func() { done <- srv.Serve(Listener(l, r.cfg.Limits.HeaderBytes)) }()
	defer func() {
		srv.Close()
		<-done
	}()
	c, err := net.Dial("tcp", l.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	go io.WriteString(c, request) // the service may answer and close before it has all
	w, err := http.ReadResponse(bufio.NewReader(c), nil)
	if err != nil {
		t.Fatal(err)
	}
	defer w.Body.Close()
	text, err := io.ReadAll(w.Body)
	if err != nil {
		t.Fatal(err)
	}
	return w.StatusCode, text
}
