package main

import (
	"archive/zip"
	"bufio"
	"bytes"
	"compress/gzip"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"
)

// badRequest is one line of testdata/badrequests: a request by its parts, or the
// raw bytes of what is not one, and what it is to get.
type badRequest struct {
	Name           string `json:"name"`
	Method, Target string
	Headers        map[string]string `json:"headers"`
	Body           string            `json:"body"`
	Generate       *generator        `json:"generate"`
	Raw            *string           `json:"raw"`
	Half           bool              `json:"half"`   // the client breaks off after it
	Status         []int             `json:"status"` // any of these; 0: no answer at all
	Place          string            `json:"place"`  // that one of errors[] names
}

// generator is a rule for a body that is too long to write down.
type generator struct {
	Kind                string `json:"kind"`
	Before, Text, After string
	Open, Close         string
	Count               int
	Bytes               int
}

func (g *generator) body(t *testing.T) []byte {
	t.Helper()
	var b bytes.Buffer
	switch g.Kind {
	case "repeat":
		b.WriteString(g.Before + strings.Repeat(g.Text, g.Count) + g.After)
	case "nest":
		b.WriteString(g.Before + strings.Repeat(g.Open, g.Count) + strings.Repeat(g.Close, g.Count) + g.After)
	case "hex":
		raw, err := hex.DecodeString(g.Text)
		if err != nil {
			t.Fatal(err)
		}
		b.Write(raw)
	case "gzip-bomb":
		z := gzip.NewWriter(&b)
		z.Write(make([]byte, g.Bytes))
		z.Close()
	case "zip-bomb":
		z := zip.NewWriter(&b)
		w, err := z.Create("sites.csv")
		if err != nil {
			t.Fatal(err)
		}
		w.Write(make([]byte, g.Bytes))
		z.Close()
	default:
		t.Fatalf("no generator %q", g.Kind)
	}
	return b.Bytes()
}

// bytes are what goes over the wire.
func (r *badRequest) bytes(t *testing.T) []byte {
	t.Helper()
	if r.Raw != nil {
		return []byte(*r.Raw)
	}
	if r.Generate != nil && r.Generate.Kind == "header" {
		long := strings.Repeat("x", 100<<10)
		switch r.Generate.Text {
		case "request line":
			return []byte("GET /v1/point?" + long + " HTTP/1.1\r\nHost: x\r\n\r\n")
		case "one header":
			return []byte("GET /healthz HTTP/1.1\r\nHost: x\r\nA: " + long + "\r\n\r\n")
		default:
			return []byte("GET /healthz HTTP/1.1\r\nHost: x\r\n" + strings.Repeat("A: x\r\n", 20_000) + "\r\n")
		}
	}
	body := []byte(r.Body)
	if r.Generate != nil {
		body = r.Generate.body(t)
	}
	var b bytes.Buffer
	fmt.Fprintf(&b, "%s %s HTTP/1.1\r\nHost: x\r\n", r.Method, r.Target)
	for k, v := range r.Headers {
		fmt.Fprintf(&b, "%s: %s\r\n", k, v)
	}
	if r.Method != http.MethodGet || len(body) > 0 {
		fmt.Fprintf(&b, "Content-Length: %d\r\n", len(body))
	}
	b.WriteString("\r\n")
	b.Write(body)
	return b.Bytes()
}

func badRequests(t *testing.T) []badRequest {
	t.Helper()
	f, err := os.Open(filepath.Join(root, "testdata", "badrequests", "requests.jsonl"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	d := json.NewDecoder(f)
	d.DisallowUnknownFields()
	var out []badRequest
	for {
		var r badRequest
		if err := d.Decode(&r); err == io.EOF {
			return out
		} else if err != nil {
			t.Fatalf("request %d: %v", len(out)+1, err)
		}
		out = append(out, r)
	}
}

// TestBadRequests sends every bad request of the corpus to a running server, over
// a connection of its own: no answer of 5xx, no panic, a problem document that
// names the place, and no memory left behind.
func TestBadRequests(t *testing.T) {
	const boundBytes = 32 << 20
	list := badRequests(t)
	if len(list) < 500 {
		t.Errorf("%d requests, want several hundred", len(list))
	}
	address := startServer(t)
	var before, after runtime.MemStats
	for round := range 2 {
		for _, r := range list {
			if round == 0 { // the second time is for the memory
				t.Run(r.Name, func(t *testing.T) { r.replay(t, address) })
			} else if r.Generate == nil {
				r.replay(t, address)
			}
		}
		runtime.GC()
		if round == 0 {
			runtime.ReadMemStats(&before)
		}
	}
	runtime.ReadMemStats(&after)
	if after.HeapAlloc > before.HeapAlloc+boundBytes || before.HeapAlloc > 512<<20 {
		t.Errorf("heap after one round %d bytes, after two %d", before.HeapAlloc, after.HeapAlloc)
	}
	metrics := getText(t, "http://"+address+"/metrics")
	if !strings.Contains(metrics, "nearmargin_panics_total 0\n") || strings.Contains(metrics, `status="5`) {
		t.Errorf("a panic, or an answer of 5xx:\n%s", metrics)
	}
	if got := getText(t, "http://"+address+"/v1/point?lon=-72.4&lat=-36.1"); !strings.Contains(got, `"code":"SA"`) {
		t.Errorf("afterwards a point is answered with %s", got)
	}
}

func (r *badRequest) replay(t *testing.T, address string) {
	conn, err := net.Dial("tcp", address)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	conn.SetDeadline(time.Now().Add(time.Minute))
	message := r.bytes(t)
	go func() { // the answer may come before all is sent
		conn.Write(message)
		if r.Half {
			conn.(*net.TCPConn).CloseWrite()
		}
	}()
	res, err := http.ReadResponse(bufio.NewReader(conn), &http.Request{Method: r.Method})
	if err != nil {
		if !slices.Contains(r.Status, 0) {
			t.Errorf("%s: no answer: %v", r.Name, err)
		}
		return
	}
	body, err := io.ReadAll(res.Body)
	if err != nil && len(body) == 0 {
		t.Errorf("%s: %v", r.Name, err)
	}
	if !slices.Contains(r.Status, res.StatusCode) || res.StatusCode >= 500 {
		t.Errorf("%s: status %d, want %v: %.300s", r.Name, res.StatusCode, r.Status, body)
		return
	}
	checkProblem(t, r, res, body)
}

// checkProblem sees to it that an answer is a problem document that names places.
func checkProblem(t *testing.T, r *badRequest, res *http.Response, body []byte) {
	t.Helper()
	var p struct {
		Type, Title, Detail string
		Status              int
		Errors              []struct {
			Parameter, Detail string
			Pointer           *string
			Line, Column      int
		}
	}
	if ct := res.Header.Get("Content-Type"); ct != "application/problem+json" {
		t.Errorf("%s: content type %q: %.200s", r.Name, ct, body)
		return
	}
	if err := json.Unmarshal(body, &p); err != nil || p.Status != res.StatusCode || p.Type == "" || p.Title == "" || len(p.Errors) == 0 {
		t.Errorf("%s: %v: %.300s", r.Name, err, body)
		return
	}
	places := ""
	for _, e := range p.Errors {
		if e.Detail == "" || e.Parameter == "" && e.Pointer == nil && e.Line == 0 {
			t.Errorf("%s: a fault without a place or a detail: %s", r.Name, body)
		}
		places += "|" + e.Parameter
		if e.Pointer != nil {
			places += "|" + *e.Pointer
		}
	}
	if r.Place != "" && !strings.Contains(places+"|", "|"+r.Place+"|") {
		t.Errorf("%s: places %s, want %s", r.Name, places, r.Place)
	}
}

func getText(t *testing.T, url string) string {
	t.Helper()
	res, err := http.Get(url)
	if err != nil {
		t.Fatal(err)
	}
	defer res.Body.Close()
	body, err := io.ReadAll(res.Body)
	if err != nil {
		t.Fatal(err)
	}
	return string(body)
}
