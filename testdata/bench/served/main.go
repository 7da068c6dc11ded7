//go:build linux

// Command served measures the program as its users run it, as processes of its own:
//
//	go build -o /tmp/nearmargin ./cmd/nearmargin
//	go run ./testdata/bench/served -program /tmp/nearmargin point stream start memory
//
// point compares requests for a place with a bare handler, the server on the first
// processor and the client on the second; stream compares batches over HTTP with the
// command line; start measures the time from exec to the first answer; memory the
// largest resident size over more and more rows. It talks to loopback alone.
package main

import (
	"flag"
	"fmt"
	"log"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"syscall"
	"time"
)

var (
	program = flag.String("program", "", "the nearmargin `file` to measure")
	model   = flag.String("model", "", "a model's `directory`, for start; the built-in model where empty")
	most    = flag.Int("rows", 1_000_000, "the largest `number` of rows, for memory")
	grids   = flag.String("grids", "", "write made-up grids of 19 slabs into a `directory` and do nothing else")
	bare    = flag.Int("bare", 0, "serve a body of that many `bytes` and nothing else")
)

func main() {
	runtime.LockOSThread() // what this thread starts ends with it
	flag.Parse()
	if *bare > 0 {
		serveBare(*bare)
		return
	}
	if *grids != "" {
		writeGrids(*grids)
		return
	}
	if *program == "" || flag.NArg() == 0 {
		log.Fatal("want -program FILE and some of: point stream start memory")
	}
	for _, part := range flag.Args() {
		switch part {
		case "point":
			point()
		case "stream":
			stream()
		case "start":
			start()
		case "memory":
			memory()
		default:
			log.Fatalf("%q is not a part; there are point, stream, start and memory", part)
		}
	}
}

// process is a server under test.
type process struct {
	cmd  *exec.Cmd
	addr string
}

// begin starts a server, which ends with this program.
func begin(addr string, cmd *exec.Cmd) *process {
	if c, err := net.Dial("tcp", addr); err == nil {
		c.Close()
		log.Fatalf("something listens on %s already", addr)
	}
	cmd.SysProcAttr = &syscall.SysProcAttr{Pdeathsig: syscall.SIGKILL}
	if err := cmd.Start(); err != nil {
		log.Fatal(err)
	}
	return &process{cmd, addr}
}

// launch starts a server and waits until it answers.
func launch(addr string, arg ...string) *process {
	cmd := exec.Command(arg[0], arg[1:]...)
	p := begin(addr, cmd)
	for range 500 {
		if _, _, err := ask(addr, "/v1/point?lon=0.5&lat=0.5"); err == nil {
			return p
		}
		time.Sleep(10 * time.Millisecond)
	}
	p.stop()
	log.Fatalf("%v does not answer on %s", arg, addr)
	return nil
}

func (p *process) stop() {
	p.cmd.Process.Signal(syscall.SIGTERM)
	p.cmd.Wait()
}

// cpu returns the processor time that the process has used: the sum over its threads,
// which Go does not end.
func (p *process) cpu() time.Duration {
	names, _ := filepath.Glob(fmt.Sprintf("/proc/%d/task/*/schedstat", p.cmd.Process.Pid))
	var sum, ns int64
	for _, name := range names {
		text, err := os.ReadFile(name)
		if err != nil {
			log.Fatal(err)
		}
		fmt.Sscan(string(text), &ns)
		sum += ns
	}
	return time.Duration(sum)
}

// status returns a size from the process's status, in MB.
func (p *process) status(key string) float64 {
	text, err := os.ReadFile(fmt.Sprintf("/proc/%d/status", p.cmd.Process.Pid))
	if err != nil {
		log.Fatal(err)
	}
	for line := range strings.Lines(string(text)) {
		if rest, ok := strings.CutPrefix(line, key+":"); ok {
			var kb float64
			fmt.Sscan(rest, &kb)
			return kb / 1000
		}
	}
	log.Fatalf("no %s in the status", key)
	return 0
}

func median(x []float64) float64 { return quantile(x, 0.5) }

func quantile(x []float64, q float64) float64 {
	x = slices.Clone(x)
	slices.Sort(x)
	return x[min(len(x)-1, int(q*float64(len(x))))]
}
