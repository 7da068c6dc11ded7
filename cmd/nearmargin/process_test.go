package main

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"nearmargin/store/storetest"
)

// asProgram is set where the test binary is to be the program itself. So tests can
// kill a real process, which has the race detector where the tests have it.
const asProgram = "NEARMARGIN_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
	}
	storetest.Main(m)
}

// programCommand is the program with arguments, in an environment without settings.
func programCommand(t *testing.T, args ...string) *exec.Cmd {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(self, args...)
	for _, e := range os.Environ() {
		if !strings.HasPrefix(e, "NEARMARGIN_") {
			c.Env = append(c.Env, e)
		}
	}
	c.Env = append(c.Env, asProgram+"=1")
	return c
}

// process is a service in a process of its own.
type process struct {
	t                *testing.T
	cmd              *exec.Cmd
	address, private string
	ended            chan struct{} // closed when it has ended
	mu               sync.Mutex
	log              bytes.Buffer // but for the records of requests that went well
}

// startProcess starts a service with a private address and profiles. It is killed when
// the test ends, which fails where the race detector or a panic spoke.
func startProcess(t *testing.T, args ...string) *process {
	t.Helper()
	p := &process{t: t, ended: make(chan struct{})}
	p.cmd = programCommand(t, append([]string{"serve", "--listen", "127.0.0.1:0", "--private-listen", "127.0.0.1:0", "--pprof"}, args...)...)
	logs, err := p.cmd.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := p.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	up := make(chan [2]string, 1)
	go func() {
		p.follow(logs, up)
		p.cmd.Wait() // how it ended is in the state
		close(p.ended)
	}()
	t.Cleanup(func() {
		p.kill()
		checkLog(t, p.text())
	})
	select {
	case a := <-up:
		p.address, p.private = a[0], a[1]
	case <-p.ended:
		t.Fatalf("serve ended: %v\n%s", p.cmd.ProcessState, p.text())
	case <-time.After(time.Minute):
		t.Fatalf("the service does not listen:\n%s", p.text())
	}
	return p
}

// follow reads the log and tells the two addresses.
func (p *process) follow(logs io.Reader, up chan<- [2]string) {
	var found [2]string
	r := bufio.NewReader(logs)
	for {
		line, err := r.ReadString('\n')
		var rec struct{ Msg, Address, Status string }
		if json.Unmarshal([]byte(line), &rec) == nil {
			switch rec.Msg {
			case "listening on the private address":
				found[1] = rec.Address
			case "listening":
				found[0] = rec.Address
				up <- found
			}
		}
		if rec.Msg != "request" || rec.Status >= "500" && rec.Status < "600" {
			p.mu.Lock()
			p.log.WriteString(line)
			p.mu.Unlock()
		}
		if err != nil {
			return
		}
	}
}

// text is what the process logged so far.
func (p *process) text() string {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.log.String()
}

// checkLog fails a test whose process had a data race or a panic.
func checkLog(t *testing.T, log string) {
	t.Helper()
	for _, bad := range []string{"DATA RACE", "panic", "goroutine "} {
		if i := strings.Index(log, bad); i >= 0 {
			t.Errorf("the process said: %.4000s", log[max(0, i-200):])
			return
		}
	}
}

// kill ends the process as the power does.
func (p *process) kill() {
	p.cmd.Process.Signal(syscall.SIGKILL) // it may have ended
	<-p.ended
}

// terminate asks the process to end and returns its exit status.
func (p *process) terminate() int {
	p.t.Helper()
	if err := p.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		p.t.Fatal(err)
	}
	<-p.ended
	return p.cmd.ProcessState.ExitCode()
}

func (p *process) url(path string) string { return "http://" + p.address + path }

// gauges are the metrics without labels.
func (p *process) gauges() map[string]float64 {
	p.t.Helper()
	res, err := http.Get("http://" + p.private + "/metrics")
	if err != nil {
		p.t.Fatal(err)
	}
	defer res.Body.Close()
	out := map[string]float64{}
	for sc := bufio.NewScanner(res.Body); sc.Scan(); {
		name, value, _ := strings.Cut(sc.Text(), " ")
		if x, err := strconv.ParseFloat(value, 64); err == nil {
			out[name] = x
		}
	}
	if len(out) < 10 {
		p.t.Fatalf("%d metrics", len(out))
	}
	return out
}

// heldResources are what a process has of those things that leak.
type heldResources struct{ goroutines, descriptors int }

func (p *process) held() heldResources {
	p.t.Helper()
	http.DefaultClient.CloseIdleConnections()
	g := p.gauges()
	return heldResources{goroutines: int(g["go_goroutines"]), descriptors: int(g["process_open_fds"])}
}

// backTo waits until the process holds no more than it did.
func (p *process) backTo(before heldResources) {
	p.t.Helper()
	var now heldResources
	for end := time.Now().Add(time.Minute); ; time.Sleep(50 * time.Millisecond) {
		now = p.held()
		if now.goroutines <= before.goroutines && now.descriptors <= before.descriptors {
			return
		}
		if time.Now().After(end) {
			break
		}
	}
	p.t.Errorf("it holds %d goroutines and %d descriptors, before %d and %d:\n%.6000s", now.goroutines, now.descriptors, before.goroutines, before.descriptors, p.stacks())
}

// stacks are the goroutines that the process has.
func (p *process) stacks() string {
	_, text := get(p.t, p.private, "/debug/pprof/goroutine?debug=1")
	return text
}

// freeAddress is an address where nothing listens.
func freeAddress(t *testing.T) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	return l.Addr().String()
}

// table is a data set in one of the formats, and how a batch of it is asked for.
type table struct {
	name, contentType string
	before, after     string
	row               func(i int) string
}

// tables are the formats whose answers have a line a row.
var tables = []table{
	{"csv", "text/csv", "id,lon,lat\n", "", func(i int) string {
		return fmt.Sprintf("%06d,%d.5,%d.25\n", i, i*7%360-179, i*3%178-89)
	}},
	{"ndjson", "application/x-ndjson", "", "", func(i int) string {
		return fmt.Sprintf(`{"id":%d,"lon":%d.5,"lat":%d.25}`+"\n", i, i*7%360-179, i*3%178-89)
	}},
	{"geojson", "application/geo+json", `{"type":"FeatureCollection","features":[` + "\n", "]}\n", func(i int) string {
		comma := ","
		if i == 0 {
			comma = ""
		}
		return fmt.Sprintf(`%s{"type":"Feature","geometry":{"type":"Point","coordinates":[%d.5,%d.25]},"properties":{"id":%d}}`+"\n", comma, i*7%360-179, i*3%178-89, i)
	}},
}

// rows writes rows from one number to another.
func (f *table) rows(from, to int) string {
	var b strings.Builder
	for i := from; i < to; i++ {
		b.WriteString(f.row(i))
	}
	return b.String()
}

// whole is a table of n rows.
func (f *table) whole(n int) string { return f.before + f.rows(0, n) + f.after }

// annotate asks for a whole table.
func (f *table) annotate(t *testing.T, address, body string) string {
	t.Helper()
	res, err := http.Post("http://"+address+"/v1/annotate", f.contentType, strings.NewReader(body))
	if err != nil {
		t.Fatal(err)
	}
	defer res.Body.Close()
	raw, err := io.ReadAll(res.Body)
	if err != nil || res.StatusCode != http.StatusOK || res.Trailer.Get("Nearmargin-Rows") == "" {
		t.Fatalf("%s: status %d, %v, trailers %v: %.300s", f.name, res.StatusCode, err, res.Trailer, raw)
	}
	return string(raw)
}
