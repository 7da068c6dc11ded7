package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"time"

	"nearmargin/setting"
)

const root = "../.."

func readme(t *testing.T) string {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(root, "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	return string(raw)
}

var fenced = regexp.MustCompile("(?s)```([a-z]+)\n(.*?)```")

// TestReadmeShowsTheRules keeps the rule table in the README the program's own.
func TestReadmeShowsTheRules(t *testing.T) {
	for _, b := range fenced.FindAllStringSubmatch(readme(t), -1) {
		if b[1] == "text" && b[2] == setting.RuleTable() {
			return
		}
	}
	t.Errorf("the README has no text block with the rule table:\n%s", setting.RuleTable())
}

// TestReadmeCommands runs every command of the README whose answer it tells,
// against a server of its own. What follows "# →" must stand in the output.
func TestReadmeCommands(t *testing.T) {
	for _, tool := range []string{"sh", "curl"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
	address := startServer(t)
	binary := filepath.Join(t.TempDir(), "nearmargin")
	if out, err := exec.Command("go", "build", "-o", binary, ".").CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	ran := 0
	for _, b := range fenced.FindAllStringSubmatch(readme(t), -1) {
		if b[1] != "sh" {
			continue
		}
		for _, line := range strings.Split(b[2], "\n") {
			command, want, ok := strings.Cut(line, "# → ")
			if !ok {
				continue
			}
			ran++
			command = strings.ReplaceAll(command, "127.0.0.1:8080", address)
			command = strings.ReplaceAll(command, "./nearmargin", binary)
			c := exec.Command("sh", "-c", command)
			c.Dir = root
			var errs bytes.Buffer
			c.Stderr = &errs
			out, err := c.Output()
			if err != nil || !strings.Contains(string(out), strings.TrimSpace(want)) {
				t.Errorf("%s\n%v, stderr %s\ngave %.600s\nwant %q in it", command, err, &errs, out, want)
			}
		}
	}
	if ran < 10 {
		t.Errorf("only %d commands of the README tell their answer", ran)
	}
}

// startServer serves the built-in model, or what the flags say, on a free port until the test ends.
func startServer(t *testing.T, flags ...string) (address string) {
	t.Helper()
	ctx, cancel := context.WithCancel(context.Background())
	logs, w := io.Pipe()
	done := make(chan int, 1)
	go func() {
		p := &program{env: func(string) string { return "" }, stdin: strings.NewReader(""), stdout: io.Discard, stderr: w}
		done <- p.run(ctx, append([]string{"serve", "--listen", "127.0.0.1:0"}, flags...))
		w.Close()
	}()
	found := make(chan string, 1)
	go func() {
		sc := bufio.NewScanner(logs)
		for sc.Scan() {
			var rec struct{ Msg, Address string }
			if json.Unmarshal(sc.Bytes(), &rec) == nil && rec.Msg == "listening" {
				found <- rec.Address
			}
		}
	}()
	t.Cleanup(func() {
		cancel()
		if status := <-done; status != exitDone {
			t.Errorf("serve ended with status %d", status)
		}
	})
	select {
	case address = <-found:
	case status := <-done:
		done <- status
		t.Fatalf("serve ended with status %d", status)
	case <-time.After(30 * time.Second):
		t.Fatal("the server does not listen")
	}
	return address
}

func TestServeRefusesABusyPort(t *testing.T) {
	address := startServer(t)
	got := invoke(t, nil, "", "serve", "--listen", address)
	if got.status != exitFailed || !strings.Contains(got.stderr, "address already in use") {
		t.Errorf("status %d, stderr %s", got.status, got.stderr)
	}
}
