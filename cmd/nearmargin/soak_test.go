package main

import (
	"context"
	"fmt"
	"io"
	"math/rand/v2"
	"net/http"
	"os"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"
)

// The soak: a mixed load of 60 requests a second on a service of its own, for some
// seconds, or for as long as NEARMARGIN_SOAK says:
//
//	NEARMARGIN_SOAK=1h go test ./cmd/nearmargin -run TestSoak -v -timeout 75m
const (
	shortSoak = 8 * time.Second
	soakRate  = 60 // requests a second
	soakOpen  = 32 // requests at once; beyond that the load waits
)

// soaked is what came of one request.
type soaked struct {
	kind  string
	took  time.Duration
	fault string // empty where it went as it should
}

// soakKind is one kind of request.
type soakKind struct {
	name  string
	share int // of 100
	ask   func(ctx context.Context, s *soak, rnd *rand.Rand) (fault string)
}

// soak drives one process.
type soak struct {
	p      *process
	client *http.Client
	bodies map[string]string // of batches, by format
}

// expect makes a request and reads its answer to the end.
func (s *soak) expect(ctx context.Context, want int, method, path, contentType, body string) string {
	req, err := http.NewRequestWithContext(ctx, method, s.p.url(path), strings.NewReader(body))
	if err != nil {
		return err.Error()
	}
	if body != "" {
		req.Header.Set("Content-Type", contentType)
	}
	res, err := s.client.Do(req)
	if err != nil {
		return err.Error()
	}
	defer res.Body.Close()
	n, err := io.Copy(io.Discard, res.Body)
	if err != nil || n == 0 || res.StatusCode != want {
		return fmt.Sprintf("%s %s: status %d, %d bytes, %v", method, path, res.StatusCode, n, err)
	}
	if strings.HasPrefix(path, "/v1/annotate") && want == http.StatusOK && contentType != "application/json" && res.Trailer.Get("Nearmargin-Rows") == "" {
		return path + ": no trailers"
	}
	return ""
}

// begin starts a batch and returns its answer, unread.
func (s *soak) begin(ctx context.Context, f *table, body io.Reader) (*http.Response, error) {
	req, err := http.NewRequestWithContext(ctx, http.MethodPost, s.p.url("/v1/annotate"), body)
	if err != nil {
		return nil, err
	}
	req.Header.Set("Content-Type", f.contentType)
	return s.client.Do(req)
}

func position(rnd *rand.Rand) string {
	return fmt.Sprintf("lon=%.4f&lat=%.4f", rnd.Float64()*360-180, rnd.Float64()*180-90)
}

var soakKinds = []soakKind{
	{"point", 62, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		return s.expect(ctx, http.StatusOK, http.MethodGet, "/v1/point?"+position(rnd), "", "")
	}},
	{"area", 6, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		lon, lat := rnd.Float64()*340-170, rnd.Float64()*150-80
		return s.expect(ctx, http.StatusOK, http.MethodGet, fmt.Sprintf("/v1/area?bbox=%.3f,%.3f,%.3f,%.3f", lon, lat, lon+3, lat+2), "", "")
	}},
	{"section", 4, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		path := [...]string{"/v1/section", "/v1/section.svg"}[rnd.IntN(2)]
		return s.expect(ctx, http.StatusOK, http.MethodGet, fmt.Sprintf("%s?lon=-71.5&lat=%.3f", path, -35+3*rnd.Float64()), "", "")
	}},
	{"map and layers", 2, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		path := [...]string{"/", "/v1/slabs", "/v1/boundaries?bbox=-30,0,-20,10", "/openapi.json", "/readyz"}[rnd.IntN(5)]
		return s.expect(ctx, http.StatusOK, http.MethodGet, path, "", "")
	}},
	{"csv", 6, batchOf(0)},
	{"ndjson", 4, batchOf(1)},
	{"geojson", 3, batchOf(2)},
	{"array", 3, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		return s.expect(ctx, http.StatusOK, http.MethodPost, "/v1/annotate", "application/json", `[{"lon":36.3,"lat":-0.9},{"lon":null,"lat":1}]`)
	}},
	{"bad", 6, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		switch rnd.IntN(4) {
		case 0:
			return s.expect(ctx, http.StatusBadRequest, http.MethodGet, "/v1/point?lon=10&lat=120", "", "")
		case 1:
			return s.expect(ctx, http.StatusBadRequest, http.MethodPost, "/v1/annotate", "text/csv", "a,b\n1,2\n")
		case 2:
			return s.expect(ctx, http.StatusBadRequest, http.MethodPost, "/v1/annotate", "application/geo+json", `{"type":"FeatureColl`)
		}
		return s.expect(ctx, http.StatusUnsupportedMediaType, http.MethodPost, "/v1/annotate", "text/html", "<p>")
	}},
	// a client that goes away while its batch is answered
	{"leaver", 2, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		ctx, leave := context.WithCancel(ctx)
		defer leave()
		f := &tables[rnd.IntN(len(tables))]
		in, out := io.Pipe()
		go io.WriteString(out, s.bodies[f.name+" long"]) // never closed: only leaving ends it
		defer in.Close()
		// a client whose request is refused waits for the end of its body
		late := time.AfterFunc(20*time.Second, func() { out.CloseWithError(io.ErrUnexpectedEOF) })
		defer late.Stop()
		res, err := s.begin(ctx, f, in)
		if err != nil {
			return err.Error()
		}
		defer res.Body.Close()
		_, err = io.ReadFull(res.Body, make([]byte, 1000))
		if err != nil {
			return err.Error()
		}
		return ""
	}},
	// a client that sips its answer
	{"sipper", 2, func(ctx context.Context, s *soak, rnd *rand.Rand) string {
		f := &tables[rnd.IntN(len(tables))]
		res, err := s.begin(ctx, f, strings.NewReader(s.bodies[f.name+" long"]))
		if err != nil {
			return err.Error()
		}
		defer res.Body.Close()
		for range 20 {
			if _, err := io.CopyN(io.Discard, res.Body, 1<<10); err != nil {
				return err.Error()
			}
			time.Sleep(100 * time.Millisecond)
		}
		if _, err := io.Copy(io.Discard, res.Body); err != nil || res.Trailer.Get("Nearmargin-Rows") == "" {
			return fmt.Sprintf("the end of a sipped batch: %v, trailers %v", err, res.Trailer)
		}
		return ""
	}},
}

func batchOf(i int) func(context.Context, *soak, *rand.Rand) string {
	return func(ctx context.Context, s *soak, _ *rand.Rand) string {
		f := &tables[i]
		return s.expect(ctx, http.StatusOK, http.MethodPost, "/v1/annotate", f.contentType, s.bodies[f.name])
	}
}

// pick returns a kind of request by its share.
func pick(rnd *rand.Rand) *soakKind {
	n := rnd.IntN(100)
	for i := range soakKinds {
		if n -= soakKinds[i].share; n < 0 {
			return &soakKinds[i]
		}
	}
	panic("the shares of the soak are less than 100")
}

// soakSample is one line of the table.
type soakSample struct {
	at           time.Duration
	requests     int
	faults       int
	p50, p99     time.Duration // of points
	all50, all99 time.Duration // of everything that ends by itself
	rssMB        float64
	held         heldResources
	heapMB       float64
}

func quantile(d []time.Duration, q float64) time.Duration {
	if len(d) == 0 {
		return 0
	}
	slices.Sort(d)
	return d[min(len(d)-1, int(q*float64(len(d))))]
}

// sample sums a span of time up and asks the process how it is.
func (s *soak) sample(at time.Duration, list []soaked) soakSample {
	var points, all []time.Duration
	x := soakSample{at: at, requests: len(list)}
	for _, r := range list {
		if r.fault != "" {
			x.faults++
		}
		switch r.kind {
		case "point":
			points = append(points, r.took)
			all = append(all, r.took)
		case "leaver", "sipper":
		default:
			all = append(all, r.took)
		}
	}
	x.p50, x.p99, x.all50, x.all99 = quantile(points, .5), quantile(points, .99), quantile(all, .5), quantile(all, .99)
	g := s.p.gauges()
	x.rssMB, x.heapMB = g["process_resident_memory_bytes"]/1e6, g["go_memstats_heap_alloc_bytes"]/1e6
	x.held = heldResources{goroutines: int(g["go_goroutines"]), descriptors: int(g["process_open_fds"])}
	return x
}

// heapMB is what is in use after a collection.
func (s *soak) liveMB() float64 {
	for range 2 { // what the first one frees may keep other things
		get(s.p.t, s.p.private, "/debug/pprof/heap?gc=1")
	}
	return s.p.gauges()["go_memstats_heap_alloc_bytes"] / 1e6
}

// drive sends the load for a time and calls each with every line of the table.
func (s *soak) drive(ctx context.Context, length, span time.Duration, seed uint64, each func(soakSample)) (faults []string) {
	rnd := rand.New(rand.NewPCG(seed, 1))
	results := make(chan soaked, 1000)
	places := make(chan struct{}, soakOpen)
	var running sync.WaitGroup
	stop := make(chan struct{})
	go func() {
		tick := time.NewTicker(time.Second / soakRate)
		defer tick.Stop()
		for {
			select {
			case <-stop:
				running.Wait()
				close(results)
				return
			case <-tick.C:
			}
			places <- struct{}{}
			k, seed := pick(rnd), rnd.Uint64()
			running.Go(func() {
				start := time.Now()
				fault := k.ask(ctx, s, rand.New(rand.NewPCG(seed, 2)))
				results <- soaked{k.name, time.Since(start), fault}
				<-places
			})
		}
	}()
	start := time.Now()
	lines := time.NewTicker(span)
	defer lines.Stop()
	var list []soaked
	for stopped := false; ; {
		select {
		case r, more := <-results:
			if !more {
				return faults
			}
			list = append(list, r)
			if r.fault != "" && len(faults) < 20 {
				faults = append(faults, r.kind+": "+r.fault)
			}
		case <-lines.C:
			if stopped {
				continue
			}
			each(s.sample(time.Since(start), list))
			list = list[:0]
			if time.Since(start) >= length-span/2 {
				stopped = true
				close(stop)
			}
		}
	}
}

func mean(list []soakSample, of func(soakSample) float64) float64 {
	sum := 0.0
	for _, x := range list {
		sum += of(x)
	}
	return sum / float64(len(list))
}

// TestSoak looks for what grows: goroutines and descriptors must be back where they
// were when the load is over, the live heap too, and the memory that the process has
// must not grow over the second half.
func TestSoak(t *testing.T) {
	length, span := shortSoak, shortSoak/4
	if given := os.Getenv("NEARMARGIN_SOAK"); given != "" {
		var err error
		if length, err = time.ParseDuration(given); err != nil || length < shortSoak {
			t.Fatalf("NEARMARGIN_SOAK=%s: want a duration of %v or more", given, shortSoak)
		}
		span = max(span, min(time.Minute, length/4))
	}
	s := &soak{p: startProcess(t, "--max-batches", "500"), client: &http.Client{Transport: &http.Transport{MaxIdleConnsPerHost: soakOpen}}, bodies: map[string]string{}}
	for _, f := range tables {
		s.bodies[f.name], s.bodies[f.name+" long"] = f.whole(300), f.whole(4000)
	}
	seed := rand.Uint64()
	t.Logf("seed %d, %v at %d requests a second", seed, length, soakRate)
	for i := range soakKinds { // what is made once is made now
		for range 3 {
			if fault := soakKinds[i].ask(t.Context(), s, rand.New(rand.NewPCG(seed, uint64(i)))); fault != "" {
				t.Fatalf("%s: %s", soakKinds[i].name, fault)
			}
			if soakKinds[i].name == "sipper" {
				break // takes its time
			}
		}
	}
	s.client.CloseIdleConnections()
	waitFor(t, "batches to end", func() bool { return s.p.gauges()["nearmargin_batches_running"] == 0 })
	time.Sleep(200 * time.Millisecond) // connections that the clients closed
	before, live := s.p.held(), s.liveMB()

	var samples []soakSample
	t.Log("   time requests faults  point p50     p99   all p50     p99   RSS MB heap MB goroutines fds")
	faults := s.drive(t.Context(), length, span, seed, func(x soakSample) {
		samples = append(samples, x)
		t.Logf("%7s %8d %6d %8.2f ms %7.2f %9.2f %7.2f %8.1f %7.1f %10d %3d", x.at.Round(time.Second), x.requests, x.faults,
			ms(x.p50), ms(x.p99), ms(x.all50), ms(x.all99), x.rssMB, x.heapMB, x.held.goroutines, x.held.descriptors)
	})
	for _, f := range faults {
		t.Error(f)
	}
	s.client.CloseIdleConnections()
	s.p.backTo(before)
	after := s.liveMB()
	t.Logf("live heap %.1f MB before the load, %.1f MB after it", live, after)
	if after > live+8 {
		t.Errorf("the live heap grew from %.1f to %.1f MB", live, after)
	}
	if g := s.p.gauges(); g["nearmargin_panics_total"] != 0 || g["nearmargin_batches_running"] != 0 {
		t.Errorf("%v panics, %v batches run", g["nearmargin_panics_total"], g["nearmargin_batches_running"])
	}
	half := samples[len(samples)/2:]
	rss := func(x soakSample) float64 { return x.rssMB }
	third, fourth := mean(half[:(len(half)+1)/2], rss), mean(half[len(half)/2:], rss)
	if fourth > third*1.1+16 {
		t.Errorf("resident memory grew in the second half, from %.1f to %.1f MB", third, fourth)
	}
	if code := s.p.terminate(); code != exitDone {
		t.Errorf("ended with status %d", code)
	}
}

func ms(d time.Duration) float64 { return float64(d.Microseconds()) / 1000 }
