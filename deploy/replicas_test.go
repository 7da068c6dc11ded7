package deploy

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"
)

// engine runs a command of the container engine.
func engine(t *testing.T, args ...string) string {
	t.Helper()
	out, err := exec.Command("docker", args...).CombinedOutput()
	if err != nil {
		t.Fatalf("docker %s: %v: %s", strings.Join(args, " "), err, out)
	}
	return strings.TrimSpace(string(out))
}

// image builds the image from scratch that Dockerfile.static describes.
func image(t *testing.T) string {
	t.Helper()
	if testing.Short() {
		t.Skip("builds an image")
	}
	if err := exec.Command("docker", "info").Run(); err != nil {
		if os.Getenv("NEARMARGIN_REQUIRE_DATABASE") == "1" && os.Getenv("NEARMARGIN_TEST_DATABASE_URL") == "" {
			t.Fatalf("no container engine: %v", err)
		}
		t.Skipf("no container engine: %v", err)
	}
	dir := t.TempDir()
	build := exec.Command("sh", "./build", dir, "linux/"+runtime.GOARCH)
	build.Env = append(os.Environ(), "BUILDVCS=false")
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	name := fmt.Sprintf("nearmargin-test:%d", time.Now().UnixNano())
	engine(t, "build", "--quiet", "--file", "Dockerfile.static", "--tag", name, filepath.Join(dir, "linux_"+runtime.GOARCH))
	t.Cleanup(func() { engine(t, "rmi", "--force", name) })
	return name
}

// replica is one instance in a container.
type replica struct {
	id, address string
	ready       atomic.Bool
}

// replicate starts an instance as an operator would: read-only, without rights.
func replicate(t *testing.T, image string) *replica {
	t.Helper()
	id := engine(t, "run", "--detach", "--read-only", "--cap-drop", "ALL", "--security-opt", "no-new-privileges",
		"--publish", "127.0.0.1::8080", image, "serve", "--drain-time", "2s", "--shutdown-timeout", "20s")
	t.Cleanup(func() { engine(t, "rm", "--force", "--volumes", id) })
	return &replica{id: id, address: engine(t, "port", id, "8080/tcp")}
}

// balancer is a proxy before replicas, as small as one can be that does what proxies
// do: it asks each for its readiness twice a second, passes requests to those that are
// ready in turn, and where a replica refuses the connection or answers 503 before
// anything was passed on, it asks another.
type balancer struct {
	replicas []*replica
	next     atomic.Int64
	moved    atomic.Int64 // requests that another replica answered than was asked first
	client   *http.Client
}

const checkEvery = 500 * time.Millisecond

// watch keeps account of who is ready until the context ends.
func (b *balancer) watch(ctx context.Context) {
	c := &http.Client{Timeout: checkEvery}
	for ctx.Err() == nil {
		for _, r := range b.replicas {
			res, err := c.Get("http://" + r.address + "/readyz")
			r.ready.Store(err == nil && res.StatusCode == http.StatusOK)
			if err == nil {
				res.Body.Close()
			}
		}
		select {
		case <-ctx.Done():
		case <-time.After(checkEvery):
		}
	}
}

func (b *balancer) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	body, err := io.ReadAll(r.Body)
	if err != nil {
		return
	}
	first := int(b.next.Add(1))
	for i := range b.replicas {
		to := b.replicas[(first+i)%len(b.replicas)]
		if !to.ready.Load() {
			continue
		}
		req, err := http.NewRequestWithContext(r.Context(), r.Method, "http://"+to.address+r.URL.RequestURI(), bytes.NewReader(body))
		if err != nil {
			break
		}
		req.Header = r.Header.Clone()
		res, err := b.client.Do(req)
		if err != nil || res.StatusCode == http.StatusServiceUnavailable {
			if err == nil {
				res.Body.Close()
			}
			b.moved.Add(1)
			continue
		}
		defer res.Body.Close()
		for k, v := range res.Header {
			if k != "Connection" {
				w.Header()[k] = v
			}
		}
		w.WriteHeader(res.StatusCode)
		if _, err := io.Copy(flushing{w}, res.Body); err != nil {
			panic(http.ErrAbortHandler) // the one way to tell the client
		}
		for k, v := range res.Trailer {
			w.Header()[http.TrailerPrefix+k] = v
		}
		return
	}
	http.Error(w, "no replica", http.StatusBadGateway)
}

// flushing passes on at once what comes.
type flushing struct{ w http.ResponseWriter }

func (f flushing) Write(p []byte) (int, error) {
	n, err := f.w.Write(p)
	return n, errors.Join(err, http.NewResponseController(f.w).Flush())
}

// answered is what a client got, in the end, for one request.
type answered struct {
	kind  string
	tries int
	fault string // of the first try that failed
}

// crowd asks for points and batches until it is told to stop. A client whose request
// fails tries once more after a second, as INTEGRATING.md tells it to.
func crowd(address string) (stop func() []answered) {
	var table strings.Builder
	table.WriteString("id,lon,lat\n")
	const rows = 10_000
	for i := range rows {
		fmt.Fprintf(&table, "%d,%d.5,%d.25\n", i, i*7%360-179, i*3%178-89)
	}
	c := &http.Client{Transport: &http.Transport{MaxIdleConnsPerHost: 16}, Timeout: time.Minute}
	read := func(res *http.Response, err error, batch bool) string {
		if err != nil {
			return err.Error()
		}
		defer res.Body.Close()
		raw, err := io.ReadAll(res.Body)
		switch {
		case err != nil:
			return err.Error()
		case res.StatusCode != http.StatusOK:
			return fmt.Sprintf("status %d: %.200s", res.StatusCode, raw)
		case batch && (bytes.Count(raw, []byte("\n")) != rows+1 || res.Trailer.Get("Nearmargin-Rows") != fmt.Sprint(rows)):
			return fmt.Sprintf("%d lines, trailers %v", bytes.Count(raw, []byte("\n")), res.Trailer)
		case !batch && !bytes.Contains(raw, []byte(`"forearc"`)):
			return fmt.Sprintf("not the answer: %.200s", raw)
		}
		return ""
	}
	asks := map[string]func() string{
		"point": func() string {
			res, err := c.Get("http://" + address + "/v1/point?lon=-72.4&lat=-36.1")
			return read(res, err, false)
		},
		"batch": func() string {
			res, err := c.Post("http://"+address+"/v1/annotate", "text/csv", strings.NewReader(table.String()))
			return read(res, err, true)
		},
	}
	done := make(chan struct{})
	results := make(chan answered, 16)
	var load sync.WaitGroup
	client := func(kind string, pause time.Duration) {
		load.Go(func() {
			for {
				select {
				case <-done:
					return
				case <-time.After(pause):
				}
				a := answered{kind: kind, tries: 1, fault: asks[kind]()}
				for fault := a.fault; fault != "" && a.tries < 3; a.tries++ {
					time.Sleep(time.Second)
					fault = asks[kind]()
				}
				results <- a
			}
		})
	}
	for range 4 {
		client("point", 30*time.Millisecond)
	}
	for range 3 {
		client("batch", 50*time.Millisecond)
	}
	var all []answered
	gathered := make(chan struct{})
	go func() {
		for a := range results {
			all = append(all, a)
		}
		close(gathered)
	}()
	return func() []answered {
		close(done)
		load.Wait()
		close(results)
		<-gathered
		c.CloseIdleConnections()
		return all
	}
}

// TestTwoReplicas takes one of two replicas away under load: by the power, after which
// each request succeeds when it is sent again, and in good order, of which no client
// notices anything.
func TestTwoReplicas(t *testing.T) {
	image := image(t)
	for _, c := range []struct {
		name, signal string
		bearsFaults  bool
	}{{"killed", "KILL", true}, {"in good order", "TERM", false}} {
		t.Run(c.name, func(t *testing.T) {
			b := &balancer{replicas: []*replica{replicate(t, image), replicate(t, image)},
				client: &http.Client{Transport: &http.Transport{MaxIdleConnsPerHost: 16}}}
			ctx, cancel := context.WithCancel(t.Context())
			var watching sync.WaitGroup
			watching.Go(func() { b.watch(ctx) })
			defer watching.Wait()
			defer cancel()
			for end := time.Now().Add(time.Minute); !b.replicas[0].ready.Load() || !b.replicas[1].ready.Load(); time.Sleep(50 * time.Millisecond) {
				if time.Now().After(end) {
					t.Fatalf("the replicas are not ready: %s", engine(t, "logs", b.replicas[0].id))
				}
			}
			proxy := newProxy(t, b)
			stop := crowd(proxy)
			time.Sleep(2 * time.Second)
			gone := b.replicas[0]
			engine(t, "kill", "--signal", c.signal, gone.id)
			engine(t, "wait", gone.id)
			time.Sleep(2 * time.Second)
			if gone.ready.Load() || !b.replicas[1].ready.Load() {
				t.Errorf("ready are %v and %v, want the second alone", gone.ready.Load(), b.replicas[1].ready.Load())
			}
			points, batches, again := 0, 0, 0
			for _, a := range stop() {
				switch {
				case a.tries > 2, a.fault != "" && !c.bearsFaults:
					t.Errorf("a %s failed, %d tries: %s", a.kind, a.tries, a.fault)
				case a.fault != "":
					again++
				}
				if a.kind == "point" {
					points++
				} else {
					batches++
				}
			}
			t.Logf("%d points and %d batches; %d were sent again by their client, %d by the proxy", points, batches, again, b.moved.Load())
			if points < 100 || batches < 10 {
				t.Errorf("only %d points and %d batches were asked for", points, batches)
			}
			if want := map[bool]string{true: "137", false: "0"}[c.bearsFaults]; engine(t, "inspect", "--format", "{{.State.ExitCode}}", gone.id) != want {
				t.Errorf("the replica ended otherwise than with %s: %s", want, engine(t, "logs", "--tail", "20", gone.id))
			}
		})
	}
}

// newProxy serves the balancer and returns its address.
func newProxy(t *testing.T, b *balancer) string {
	t.Helper()
	s := httptest.NewServer(b)
	t.Cleanup(s.Close)
	return strings.TrimPrefix(s.URL, "http://")
}
