package main

import (
	"bufio"
	"encoding/json"
	"io"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"nearmargin/store/storetest"
)

// smallDisk is a directory on a file system of its own, of so many kB.
func smallDisk(t *testing.T, kb string) string {
	t.Helper()
	if os.Getuid() != 0 {
		t.Skip("only root can mount a small disk")
	}
	dir := t.TempDir()
	if out, err := exec.Command("mount", "-t", "tmpfs", "-o", "size="+kb+"k,mode=0755", "nearmargin-test", dir).CombinedOutput(); err != nil {
		t.Skipf("no small disk can be mounted: %v: %s", err, out)
	}
	t.Cleanup(func() {
		if out, err := exec.Command("umount", dir).CombinedOutput(); err != nil {
			t.Errorf("%v: %s", err, out)
		}
	})
	return dir
}

// fill fills a disk to its last byte.
func fill(t *testing.T, dir string) (ballast string) {
	t.Helper()
	ballast = filepath.Join(dir, "ballast")
	f, err := os.Create(ballast)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	for chunk := make([]byte, 4096); err == nil; {
		_, err = f.Write(chunk)
	}
	if !strings.Contains(err.Error(), syscall.ENOSPC.Error()) {
		t.Fatal(err)
	}
	return ballast
}

// logsTo starts a service whose log goes to a file, and that is killed when the test ends.
func logsTo(t *testing.T, log *os.File) (address string, c *exec.Cmd) {
	t.Helper()
	address = freeAddress(t)
	c = programCommand(t, "serve", "--listen", address)
	c.Stderr = log
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		c.Process.Kill()
		c.Wait()
	})
	return address, c
}

// endOrderly has a service end, and fails where it does not end well.
func endOrderly(t *testing.T, c *exec.Cmd) {
	t.Helper()
	if err := c.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	if err := c.Wait(); err != nil {
		t.Error(err)
	}
}

// TestLogOnAFullDisk serves with a log that cannot be written any more, and can again
// later.
func TestLogOnAFullDisk(t *testing.T) {
	dir := smallDisk(t, "64")
	log, err := os.OpenFile(filepath.Join(dir, "log"), os.O_CREATE|os.O_WRONLY|os.O_APPEND, 0o600)
	if err != nil {
		t.Fatal(err)
	}
	defer log.Close()
	address, c := logsTo(t, log)
	waitFor(t, "the service to listen", func() bool {
		res, err := http.Get("http://" + address + "/readyz")
		if err == nil {
			res.Body.Close()
		}
		return err == nil && res.StatusCode == http.StatusOK
	})
	ask := func(n int) {
		t.Helper()
		for range n {
			if s := status(t, "http://"+address+"/v1/point?lon=-72.4&lat=-36.1"); s != http.StatusOK {
				t.Fatalf("status %d", s)
			}
		}
	}
	waitFor(t, "the lines so far are written", func() bool {
		raw, err := os.ReadFile(log.Name())
		return err == nil && strings.Contains(string(raw), "/readyz")
	})
	ballast := fill(t, dir)
	const unheard = 300 // more than what is left of the last page takes
	ask(unheard)
	if got := tables[0].annotate(t, address, tables[0].whole(1000)); strings.Count(got, "\n") != 1001 {
		t.Error("a batch is not whole")
	}
	if err := os.Remove(ballast); err != nil {
		t.Fatal(err)
	}
	ask(3)
	endOrderly(t, c)
	raw, err := os.ReadFile(log.Name())
	if err != nil {
		t.Fatal(err)
	}
	account(t, string(raw), unheard+1+3)
}

// account checks that each request has its record in the log, or is said to be lost.
func account(t *testing.T, log string, asked float64) {
	t.Helper()
	checkLog(t, log)
	lost, torn, records := 0.0, 0, 0.0
	for line := range strings.Lines(log) {
		var rec struct {
			Msg, Route string
			Lines      float64
		}
		if json.Unmarshal([]byte(line), &rec) != nil {
			torn++
			continue
		}
		lost += rec.Lines
		if rec.Msg == "request" && strings.HasPrefix(rec.Route, "/v1/") {
			records++
		}
	}
	if records+lost != asked || records < 3 || lost < 100 || torn > 1 {
		t.Errorf("%v records of requests and %v lines said to be lost, %d torn; %v were made", records, lost, torn, asked)
	}
}

// TestLogReaderThatStandsStill serves while nobody reads the log, and reads it then.
func TestLogReaderThatStandsStill(t *testing.T) {
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	address, c := logsTo(t, w)
	w.Close()
	log := bufio.NewReader(r)
	if _, err := log.ReadString('\n'); err != nil { // it says that it listens
		t.Fatal(err)
	}
	const unread = 3000 // more than the pipe and the queue hold
	for range unread {
		if s := status(t, "http://"+address+"/v1/point?lon=1&lat=2"); s != http.StatusOK {
			t.Fatalf("status %d", s)
		}
	}
	rest := make(chan string, 1)
	go func() {
		raw, _ := io.ReadAll(log)
		rest <- string(raw)
	}()
	time.Sleep(200 * time.Millisecond) // what waits is read
	for range 3 {
		status(t, "http://"+address+"/v1/point?lon=1&lat=2")
	}
	endOrderly(t, c)
	account(t, <-rest, unread+3)
}

// TestLogWithoutAReader serves while whatever read the log has gone.
func TestLogWithoutAReader(t *testing.T) {
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	address, c := logsTo(t, w)
	w.Close()
	if _, err := bufio.NewReader(r).ReadString('\n'); err != nil { // it says that it listens
		t.Fatal(err)
	}
	r.Close()
	for range 20 {
		if s := status(t, "http://"+address+"/v1/point?lon=1&lat=2"); s != http.StatusOK {
			t.Fatalf("status %d", s)
		}
	}
	if err := c.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	if err := c.Wait(); err != nil {
		t.Errorf("it ended with %v", err)
	}
}

// TestOutputOnAFullDisk annotates into a disk that is too small, by --out and by
// standard output.
func TestOutputOnAFullDisk(t *testing.T) {
	dir := smallDisk(t, "256")
	input := filepath.Join(t.TempDir(), "sites.csv")
	if err := os.WriteFile(input, []byte(tables[0].whole(5_000)), 0o600); err != nil {
		t.Fatal(err)
	}
	before := filepath.Join(dir, "out.csv")
	if err := os.WriteFile(before, []byte("the result before\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	full := func(t *testing.T, stdout io.Writer, args ...string) {
		t.Helper()
		c := programCommand(t, args...)
		var errs strings.Builder
		c.Stdout, c.Stderr = stdout, &errs
		c.Run()
		if got := c.ProcessState.ExitCode(); got != exitFailed || !strings.Contains(errs.String(), "no space left on device") {
			t.Errorf("%v: status %d, %q", args, got, errs.String())
		}
		checkLog(t, errs.String())
	}
	full(t, nil, "annotate", input, "--out", before)
	if raw, err := os.ReadFile(before); err != nil || string(raw) != "the result before\n" {
		t.Errorf("%v, the file holds %.100q", err, raw)
	}
	if left, _ := os.ReadDir(dir); len(left) != 1 {
		t.Errorf("the run left %v", left)
	}
	out, err := os.Create(filepath.Join(dir, "redirected.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer out.Close()
	full(t, out, "annotate", input)
	// everything that prints says so where it cannot
	for _, args := range [][]string{{"point", "1", "2"}, {"version"}, {"help"}, {"annotate", "--help"}, {"model", "check", "builtin"}, {"model", "rules"}, {"section", "-71.5", "-33"}, {"serve", "--check-config"}} {
		full(t, out, args...)
	}
}

// TestOutToADevice writes to what is no file, which must stay what it is.
func TestOutToADevice(t *testing.T) {
	name := filepath.Join(t.TempDir(), "pipe")
	if err := syscall.Mkfifo(name, 0o600); err != nil {
		t.Skipf("no pipe can be made: %v", err)
	}
	got := make(chan string, 1)
	go func() {
		raw, err := os.ReadFile(name)
		if err != nil {
			raw = []byte(err.Error())
		}
		got <- string(raw)
	}()
	if r := invoke(t, nil, "lon,lat\n1,2\n", "annotate", "-", "--out", name); r.status != exitDone {
		t.Fatalf("status %d, %s", r.status, r.stderr)
	}
	if text := <-got; strings.Count(text, "\n") != 2 {
		t.Errorf("read %q", text)
	}
	if st, err := os.Stat(name); err != nil || st.Mode()&os.ModeNamedPipe == 0 {
		t.Errorf("%v, it became %v", err, st.Mode())
	}
}

// TestImportOnAFullDisk fills the database's disk under a service.
func TestImportOnAFullDisk(t *testing.T) {
	url, fillDisk, space := storetest.Get(t).Small(t)
	must(t, url, "migrate")
	ref, _, _ := strings.Cut(must(t, url, "model", "import", "builtin"), " ")
	must(t, url, "model", "activate", ref)
	dir := exported(t, "other")
	p := startProcess(t, "--database", url, "--database-poll", "1s")
	conn := storetest.Conn(t, url)
	before := inventory(t, url, conn)
	_, want := get(t, p.address, "/v1/point?lon=-72.4&lat=-36.1")

	fillDisk()
	c := programCommand(t, "model", "import", dir, "--database", url)
	out, _ := c.CombinedOutput()
	if got := c.ProcessState.ExitCode(); got != exitFailed || !strings.Contains(string(out), "disk is full; nothing was changed") {
		t.Errorf("status %d, %s", got, out)
	}
	if now := inventory(t, url, conn); now != before {
		t.Errorf("the database holds\n%s\nbefore\n%s", now, before)
	}
	if code, got := get(t, p.address, "/v1/point?lon=-72.4&lat=-36.1"); code != http.StatusOK || got != want {
		t.Errorf("the service answers %d %.300s", code, got)
	}
	if r := p.readiness(); r.code != http.StatusOK {
		t.Errorf("readyz: %+v", r)
	}

	space()
	must(t, url, "model", "import", dir)
	must(t, url, "model", "activate", "builtin@other")
	waitFor(t, "the edition to be served", func() bool {
		_, body := get(t, p.address, "/readyz")
		return strings.Contains(body, `"edition":"other"`)
	})
}
