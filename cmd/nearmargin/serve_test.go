package main

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// running is a service that a test started with flags of its own.
type running struct {
	address, private string
	stop             context.CancelFunc
	status           chan int
	log              *strings.Builder // whole once status has come
}

func startWith(t *testing.T, args ...string) *running {
	t.Helper()
	return startIn(t, func(string) string { return "" }, args...)
}

func startIn(t *testing.T, env func(string) string, args ...string) *running {
	t.Helper()
	ctx, cancel := context.WithCancel(context.Background())
	t.Cleanup(cancel)
	r := &running{stop: cancel, status: make(chan int, 1), log: &strings.Builder{}}
	logs, w := io.Pipe()
	ended := make(chan int, 1)
	go func() {
		p := &program{env: env, stdin: strings.NewReader(""), stdout: io.Discard, stderr: w}
		ended <- p.run(ctx, append([]string{"serve", "--listen", "127.0.0.1:0"}, args...))
		w.Close()
	}()
	up := make(chan [2]string, 1)
	go func() {
		var found [2]string
		for sc := bufio.NewScanner(logs); sc.Scan(); {
			r.log.WriteString(sc.Text() + "\n")
			var rec struct{ Msg, Address string }
			if json.Unmarshal(sc.Bytes(), &rec) != nil {
				continue
			}
			switch rec.Msg {
			case "listening on the private address":
				found[1] = rec.Address
			case "listening":
				found[0] = rec.Address
				up <- found
			}
		}
		r.status <- <-ended
	}()
	select {
	case a := <-up:
		r.address, r.private = a[0], a[1]
	case s := <-r.status:
		t.Fatalf("serve ended with status %d: %s", s, r.log)
	case <-time.After(time.Minute):
		t.Fatal("the service does not listen")
	}
	return r
}

func status(t *testing.T, url string) int {
	t.Helper()
	res, err := http.Get(url)
	if err != nil {
		t.Fatal(err)
	}
	res.Body.Close()
	return res.StatusCode
}

// TestPrivateAddress: metrics and profiles are on the private address and not on
// the public one.
func TestPrivateAddress(t *testing.T) {
	r := startWith(t, "--private-listen", "127.0.0.1:0", "--pprof", "--base-path", "/tectonics")
	for _, c := range []struct {
		at, path string
		want     int
	}{
		{r.address, "/metrics", 404}, {r.address, "/tectonics/metrics", 404}, {r.address, "/debug/pprof/", 404},
		{r.address, "/tectonics/v1/point?lon=1&lat=2", 200}, {r.address, "/readyz", 200},
		{r.private, "/metrics", 200}, {r.private, "/debug/pprof/", 200}, {r.private, "/debug/pprof/cmdline", 200},
		{r.private, "/readyz", 200}, {r.private, "/healthz", 200}, {r.private, "/v1/point?lon=1&lat=2", 404},
	} {
		if got := status(t, "http://"+c.at+c.path); got != c.want {
			t.Errorf("%s%s: status %d, want %d", c.at, c.path, got, c.want)
		}
	}
	if got := invoke(t, nil, "", "health", "http://"+r.private+"/readyz"); got.status != 0 || !strings.Contains(got.stdout, `"ready"`) {
		t.Errorf("health: status %d, %s%s", got.status, got.stdout, got.stderr)
	}
	r.stop()
	if s := <-r.status; s != exitDone {
		t.Errorf("ended with status %d: %s", s, r.log)
	}
}

// TestEndWithARunningBatch: given a batch that is still being sent, when the
// service is told to stop, expect readiness off at once while the batch goes on,
// and its whole answer if it ends in time; a broken answer and status 1 if not.
func TestEndWithARunningBatch(t *testing.T) {
	for _, c := range []struct {
		name    string
		ends    bool
		timeout string
	}{{"in time", true, "60s"}, {"too late", false, "1s"}} {
		t.Run(c.name, func(t *testing.T) {
			r := startWith(t, "--private-listen", "127.0.0.1:0", "--drain-time", "500ms", "--shutdown-timeout", c.timeout)
			in, out := io.Pipe()
			defer out.Close()
			line := `{"lon":-72.4,"lat":-36.1}` + "\n"
			go fmt.Fprint(out, strings.Repeat(line, 200))
			res, err := http.Post("http://"+r.address+"/v1/annotate", "application/x-ndjson", in)
			if err != nil {
				t.Fatal(err)
			}
			defer res.Body.Close()
			r.stop()
			for end := time.Now().Add(30 * time.Second); status(t, "http://"+r.private+"/readyz") != 503; time.Sleep(10 * time.Millisecond) {
				if time.Now().After(end) {
					t.Fatal("readiness stays on")
				}
			}
			if got := invoke(t, nil, "", "health", "http://"+r.private+"/readyz"); got.status != exitFailed || !strings.Contains(got.stderr, "503") {
				t.Errorf("health: status %d, %s", got.status, got.stderr)
			}
			if c.ends {
				go func() {
					fmt.Fprint(out, line)
					out.Close()
				}()
			}
			sc, rows := bufio.NewScanner(res.Body), 0
			sc.Buffer(nil, 1<<20)
			for sc.Scan() {
				rows++
			}
			s := <-r.status
			switch {
			case c.ends && (sc.Err() != nil || rows != 201 || res.Trailer.Get("Nearmargin-Rows") != "201" || s != exitDone):
				t.Errorf("%d rows, %v, trailers %v, status %d: %s", rows, sc.Err(), res.Trailer, s, r.log)
			case !c.ends && (sc.Err() == nil || s != exitFailed || !strings.Contains(r.log.String(), "cut short")):
				t.Errorf("%d rows, %v, status %d: %s", rows, sc.Err(), s, r.log)
			}
		})
	}
}

func TestCheckConfig(t *testing.T) {
	const sum = "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08"
	dir := t.TempDir()
	file := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	for _, c := range []struct {
		name   string
		env    map[string]string
		args   []string
		status int
		want   []string
	}{
		{"defaults", nil, nil, 0, []string{"NEARMARGIN_MAX_BATCHES=16\n", "NEARMARGIN_STALL_TIMEOUT=30s\n", "NEARMARGIN_LISTEN=127.0.0.1:8080\n"}},
		{"environment and flags", map[string]string{"NEARMARGIN_MAX_BATCHES": "3", "NEARMARGIN_RATE": "7"}, []string{"--rate", "9"}, 0, []string{"NEARMARGIN_MAX_BATCHES=3\n", "NEARMARGIN_RATE=9\n"}},
		{"tokens are not shown", nil, []string{"--tokens", "a query " + sum}, 0, []string{"# NEARMARGIN_TOKENS is given and not shown\n"}},
		{"a file of tokens", nil, []string{"--tokens-file", file("t", "# x\na query,batch "+sum+"\n")}, 0, nil},
		{"every fault at once", nil, []string{"--max-batches", "0", "--rate", "-1", "--header-timeout", "2m", "--base-path", "x/", "--pprof", "--cors-origins", "maps", "--trusted-proxies", "0.0.0.0/0", "--max-header-bytes", "1", "--idle-timeout", "0s"}, 2,
			[]string{"--max-batches is 0; want 1 to 1000", "--rate is -1", "--header-timeout is 2m0s and --read-timeout 1m0s", `base path "x/"`, "--pprof needs --private-listen", `origin "maps"`, "proxy 0.0.0.0/0 would believe every client", "--max-header-bytes is 1 bytes; want 4096", "--idle-timeout is 0s; want 1s to 1h0m0s"}},
		{"not a number of the environment", map[string]string{"NEARMARGIN_RATE": "many"}, nil, 2, []string{"NEARMARGIN_RATE"}},
		{"a file without tokens", nil, []string{"--tokens-file", file("none", "# none yet\n")}, 2, []string{"would let everybody in"}},
		{"no file of tokens", nil, []string{"--tokens-file", filepath.Join(dir, "absent")}, 2, []string{"--tokens-file"}},
		{"a token in place of its sum", nil, []string{"--tokens", "a query sesame"}, 2, []string{"not the token"}},
		{"an unknown model", nil, []string{"--model", filepath.Join(dir, "no")}, 1, []string{"name a model directory"}},
		{"a private address without a port", nil, []string{"--private-listen", "localhost"}, 2, []string{"--private-listen"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := invoke(t, c.env, "", append([]string{"serve", "--check-config"}, c.args...)...)
			text := got.stdout + got.stderr
			if got.status != c.status {
				t.Fatalf("status %d, want %d: %s", got.status, c.status, text)
			}
			for _, w := range c.want {
				if !strings.Contains(text, w) {
					t.Errorf("%q is not in:\n%s", w, text)
				}
			}
			if strings.Contains(text, sum) || strings.Contains(text, "sesame") {
				t.Errorf("a secret is shown:\n%s", text)
			}
		})
	}
	for _, bad := range []string{"127.0.0.1", "ftp://x", "http://", "http://127.0.0.1:1/"} {
		if got := invoke(t, nil, "", "health", bad); got.status == exitDone {
			t.Errorf("health of %s is good", bad)
		}
	}
}
