package api

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"runtime"
	"strings"
	"testing"
	"time"

	"nearmargin/api/annotate"
)

// post starts a batch and returns once the header of the answer is there.
func post(ctx context.Context, t *testing.T, url, contentType string, body io.Reader) *http.Response {
	t.Helper()
	req, err := http.NewRequestWithContext(ctx, http.MethodPost, url+"/v1/annotate", body)
	if err != nil {
		t.Fatal(err)
	}
	req.Header.Set("Content-Type", contentType)
	res, err := http.DefaultClient.Do(req)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { res.Body.Close() })
	return res
}

// form is how rows are written in one format.
type form struct {
	name, contentType           string
	before, row, between, after string
	rows                        int
	marker                      string // stands once in every row of the answer
}

var forms = []form{
	{"csv", "text/csv", "id,lon,lat\n", "%[1]d,%[2]d,%[3]d\n", "", "", 300_000, "made-up@7"},
	{"ndjson", "application/x-ndjson", "", "{\"id\":%[1]d,\"lon\":%[2]d,\"lat\":%[3]d}\n", "", "", 60_000, `"tectonic":`},
	{"geojson", "application/geo+json", `{"type":"FeatureCollection","features":[`, `{"type":"Feature","id":%[1]d,"properties":{},"geometry":{"type":"Point","coordinates":[%[2]d,%[3]d]}}`, ",", "]}", 60_000, `"tectonic":`},
}

// write writes rows to w until all are written or nobody reads any more.
func (f *form) write(w io.Writer, rows int) error {
	b := bufio.NewWriter(w)
	b.WriteString(f.before)
	for i := range rows {
		if i > 0 {
			b.WriteString(f.between)
		}
		fmt.Fprintf(b, f.row, i, i%360-180, i%179-89)
	}
	b.WriteString(f.after)
	return b.Flush()
}

// TestBatchesStreamInConstantMemory: given many rows, when they are sent through
// a pipe and read in small pieces, expect every row back and a heap that does
// not grow with their number.
func TestBatchesStreamInConstantMemory(t *testing.T) {
	const boundBytes = 16 << 20 // the answers take hundreds of MB
	srv := httptest.NewServer(newRig(t))
	defer srv.Close()
	for _, f := range forms {
		t.Run(f.name, func(t *testing.T) {
			rows := f.rows
			if testing.Short() {
				rows /= 10
			}
			in, out := io.Pipe()
			go func() { out.CloseWithError(f.write(out, rows)) }()
			start := heapBytes()
			var most uint64
			res := post(t.Context(), t, srv.URL, f.contentType, in)
			if res.StatusCode != http.StatusOK {
				t.Fatalf("status %d", res.StatusCode)
			}
			counter := newCounter(f.marker)
			piece := make([]byte, 4<<10)
			read := int64(0)
			for step := 0; ; step++ {
				n, err := res.Body.Read(piece)
				counter.Write(piece[:n])
				read += int64(n)
				if step%(4<<10) == 0 {
					most = max(most, heapBytes())
				}
				runtime.Gosched() // the writer is to be ahead of the reader
				if err == io.EOF {
					break
				}
				if err != nil {
					t.Fatal(err)
				}
			}
			if counter.n != rows {
				t.Errorf("%d rows with an answer, want %d", counter.n, rows)
			}
			if read < int64(rows)*200 {
				t.Errorf("%d bytes for %d rows: too few to prove anything", read, rows)
			}
			if most > start+boundBytes {
				t.Errorf("the heap grew by %d bytes, the bound is %d", most-start, boundBytes)
			}
		})
	}
}

func heapBytes() uint64 {
	runtime.GC()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return m.HeapAlloc
}

// counter counts a marker in what is written to it, also where it is cut.
type counter struct {
	marker, tail []byte
	n            int
}

func newCounter(marker string) *counter { return &counter{marker: []byte(marker)} }

func (c *counter) Write(p []byte) (int, error) {
	c.tail = append(c.tail, p...)
	c.n += bytes.Count(c.tail, c.marker)
	// what may still become a marker is shorter than one
	if keep := len(c.marker) - 1; len(c.tail) > keep {
		c.tail = append(c.tail[:0], c.tail[len(c.tail)-keep:]...)
	}
	return len(p), nil
}

// TestFaultHalfWay: given a batch whose fault comes after answers have left, when
// it is read, expect an error from the transfer rather than a short answer; given
// the same fault at the start, expect 400.
func TestFaultHalfWay(t *testing.T) {
	r := newRig(t)
	srv := httptest.NewServer(r)
	defer srv.Close()
	long := strings.Repeat("x", annotate.MaxRowBytes+1<<17)
	for _, c := range []struct {
		form  form
		fault string
	}{
		{forms[0], `1,"` + long},
		{forms[1], `{"x":"` + long},
		{forms[2], `,{"type"`},
	} {
		t.Run(c.form.name, func(t *testing.T) {
			var late strings.Builder
			late.WriteString(c.form.before)
			for i := range 3000 {
				if i > 0 {
					late.WriteString(c.form.between)
				}
				fmt.Fprintf(&late, c.form.row, i, 1, 2)
			}
			late.WriteString(c.fault)
			res := post(t.Context(), t, srv.URL, c.form.contentType, strings.NewReader(late.String()))
			if res.StatusCode != http.StatusOK {
				t.Fatalf("status %d, want 200 as answers have left", res.StatusCode)
			}
			n, err := io.Copy(io.Discard, res.Body)
			if err == nil {
				t.Errorf("the answer ends after %d bytes as if it were whole", n)
			}
			if n == 0 {
				t.Error("no answer came before the fault")
			}
			early := c.form.before + strings.TrimPrefix(c.fault, ",")
			w := r.ask(http.MethodPost, "/v1/annotate", c.form.contentType, early)
			if p := problem(t, w); w.Code != http.StatusBadRequest || len(p.Errors) != 1 {
				t.Errorf("at the start: status %d, %+v", w.Code, p)
			}
		})
	}
	warned, aborted := 0, 0
	for _, rec := range r.log.records(t) {
		switch {
		case rec["msg"] == "batch cut short" && rec["level"] == "WARN":
			warned++
		case rec["msg"] == "request" && rec["status"] == "aborted":
			aborted++
		}
	}
	if warned != 3 || aborted != 3 {
		t.Errorf("%d warnings and %d requests logged as aborted, want 3 of each", warned, aborted)
	}
}

// brokenBody gives some bytes and then fails as a connection does.
type brokenBody struct{ r io.Reader }

var errBroken = errors.New("connection reset by peer")

func (b brokenBody) Read(p []byte) (int, error) {
	n, err := b.r.Read(p)
	if err == io.EOF {
		err = errBroken
	}
	return n, err
}

// TestBodyThatBreaksOff: a client that breaks off is no fault of the service.
func TestBodyThatBreaksOff(t *testing.T) {
	for contentType, body := range map[string]string{
		"text/csv": "lon,lat\n1,2\n3,", "application/x-ndjson": `{"lon":1,"lat":2}` + "\n{", "application/json": "[", "application/geo+json": `{"type":`,
	} {
		r := newRig(t)
		req := httptest.NewRequest(http.MethodPost, "/v1/annotate", brokenBody{strings.NewReader(body)})
		req.Header.Set("Content-Type", contentType)
		w := httptest.NewRecorder()
		r.ServeHTTP(w, req)
		if p := problem(t, w); w.Code != http.StatusBadRequest || !strings.Contains(p.Detail, errBroken.Error()) {
			t.Errorf("%s: status %d, %+v", contentType, w.Code, p)
		}
		for _, rec := range r.log.records(t) {
			if rec["level"] != "INFO" {
				t.Errorf("%s: logged %v", contentType, rec)
			}
		}
	}
}

// TestClientThatCancels: given a client that sends without end, when it goes away
// half way, expect the handler to end.
func TestClientThatCancels(t *testing.T) {
	r := newRig(t)
	done := make(chan struct{})
	srv := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, req *http.Request) {
		defer close(done)
		r.ServeHTTP(w, req)
	}))
	defer srv.Close()
	for _, f := range forms[:1] {
		ctx, cancel := context.WithCancel(t.Context())
		defer cancel()
		in, out := io.Pipe()
		go func() { out.CloseWithError(f.write(out, 1<<40)) }()
		res := post(ctx, t, srv.URL, f.contentType, in)
		if _, err := io.CopyN(io.Discard, res.Body, 100_000); err != nil {
			t.Fatal(err)
		}
		cancel()
		select {
		case <-done:
		case <-time.After(time.Minute):
			t.Fatal("the handler goes on a minute after the client went away")
		}
	}
	for _, rec := range r.log.records(t) {
		if rec["level"] == "ERROR" {
			t.Errorf("logged %v", rec)
		}
	}
}

// TestCancelledBeforeOutput: given a context that has ended before anything was
// sent, expect the handler to stop without an answer and without a log of failure.
func TestCancelledBeforeOutput(t *testing.T) {
	for _, f := range forms {
		r := newRig(t)
		ctx, cancel := context.WithCancel(t.Context())
		cancel()
		var body bytes.Buffer
		if err := f.write(&body, 1000); err != nil {
			t.Fatal(err)
		}
		req := httptest.NewRequestWithContext(ctx, http.MethodPost, "/v1/annotate", &body)
		req.Header.Set("Content-Type", f.contentType)
		w := httptest.NewRecorder()
		func() {
			defer func() {
				if p := recover(); p != http.ErrAbortHandler {
					t.Errorf("%s: the handler ended with %v, want http.ErrAbortHandler", f.name, p)
				}
			}()
			r.ServeHTTP(w, req)
		}()
		if w.Body.Len() > 0 {
			t.Errorf("%s: %d bytes were answered", f.name, w.Body.Len())
		}
		for _, rec := range r.log.records(t) {
			if rec["level"] != "INFO" || rec["status"] != "aborted" {
				t.Errorf("%s: logged %v", f.name, rec)
			}
		}
	}
}

// TestAnswersLeaveWhileRowsComeIn: given a client that waits for answers before
// it sends the rest, expect no deadlock.
func TestAnswersLeaveWhileRowsComeIn(t *testing.T) {
	srv := httptest.NewServer(newRig(t))
	defer srv.Close()
	in, out := io.Pipe()
	first := make(chan struct{})
	go func() {
		f := forms[1]
		err := f.write(out, 3000)
		<-first
		out.CloseWithError(errors.Join(err, f.write(out, 1)))
	}()
	res := post(t.Context(), t, srv.URL, "application/x-ndjson", in)
	sc := bufio.NewScanner(res.Body)
	n := 0
	for ; sc.Scan(); n++ {
		if n == 0 {
			close(first)
		}
		if !json.Valid(sc.Bytes()) {
			t.Fatalf("line %d: %s", n+1, sc.Bytes())
		}
	}
	if sc.Err() != nil || n != 3001 {
		t.Errorf("%d lines, want 3001; %v", n, sc.Err())
	}
}
