//go:build linux

package main

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"log"
	"net"
	"net/http"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"sync"
	"time"

	"github.com/labstack/echo/v4"
)

const (
	oursAddr = "127.0.0.1:18460"
	bareAddr = "127.0.0.1:18461"
)

// serveBare is the least that a request costs with the same framework.
func serveBare(size int) {
	body := []byte(strings.Repeat("x", size))
	e := echo.New()
	e.HideBanner, e.HidePort = true, true
	e.GET("/v1/point", func(c echo.Context) error {
		c.Response().Header().Set(echo.HeaderContentLength, strconv.Itoa(len(body)))
		return c.Blob(http.StatusOK, echo.MIMEApplicationJSON, body)
	})
	log.Fatal(e.Start(bareAddr))
}

// connection asks on one kept-alive connection, with as little work as can be, so that
// the client is not what is measured.
type connection struct {
	conn net.Conn
	r    *bufio.Reader
	out  []byte
}

func dial(addr string) (*connection, error) {
	c, err := net.Dial("tcp", addr)
	if err != nil {
		return nil, err
	}
	return &connection{conn: c, r: bufio.NewReaderSize(c, 64<<10)}, nil
}

var contentLength = []byte("Content-Length: ")

// get asks once and returns the status and the body's length.
func (c *connection) get(path string) (status, length int, err error) {
	c.out = append(append(append(c.out[:0], "GET "...), path...), " HTTP/1.1\r\nHost: localhost\r\n\r\n"...)
	if _, err := c.conn.Write(c.out); err != nil {
		return 0, 0, err
	}
	length = -1
	for n := 0; ; n++ {
		line, err := c.r.ReadSlice('\n')
		if err != nil {
			return 0, 0, err
		}
		switch {
		case n == 0 && len(line) > 12:
			status, _ = strconv.Atoi(string(line[9:12]))
		case bytes.HasPrefix(line, contentLength):
			length, _ = strconv.Atoi(string(bytes.TrimSpace(line[len(contentLength):])))
		case len(line) == 2:
			if length < 0 {
				return status, 0, fmt.Errorf("%s: no Content-Length", path)
			}
			_, err := c.r.Discard(length)
			return status, length, err
		}
	}
}

// ask is get on a connection of its own.
func ask(addr, path string) (status, length int, err error) {
	c, err := dial(addr)
	if err != nil {
		return 0, 0, err
	}
	defer c.conn.Close()
	return c.get(path)
}

func placePath(i int) string {
	return fmt.Sprintf("/v1/point?lon=%d.25&lat=%d.5", i*7%358-178, i*13%179-89)
}

// point compares a place's answer with the bare handler's.
func point() {
	self, err := os.Executable()
	if err != nil {
		log.Fatal(err)
	}
	if os.Getenv("SERVED_PINNED") == "" { // the client on the second processor
		cmd := exec.Command("taskset", "-c", "1", self, "-program", *program, "point")
		cmd.Env, cmd.Stdout, cmd.Stderr = append(os.Environ(), "SERVED_PINNED=1"), os.Stdout, os.Stderr
		if err := cmd.Run(); err != nil {
			log.Fatal(err)
		}
		return
	}
	ours := launch(oursAddr, "taskset", "-c", "0", *program, "serve", "--listen", oursAddr)
	defer ours.stop()
	var sizes []float64
	for i := range 1000 {
		_, n, err := ask(oursAddr, placePath(i))
		if err != nil {
			log.Fatal(err)
		}
		sizes = append(sizes, float64(n))
	}
	bare := launch(bareAddr, "taskset", "-c", "0", self, "-bare", strconv.Itoa(int(median(sizes))))
	defer bare.stop()
	for _, connections := range []int{1, 8} {
		var rate, p99 [2][]float64
		var cpu [2]time.Duration
		const rounds, asks = 21, 4000
		for range rounds {
			for k, addr := range [...]string{oursAddr, bareAddr} {
				p := [...]*process{ours, bare}[k]
				before := p.cpu()
				r, l := load(addr, connections, asks)
				cpu[k] += p.cpu() - before
				rate[k], p99[k] = append(rate[k], r), append(p99[k], l)
			}
		}
		fmt.Printf("point, %d connections, %d rounds of %d requests, body %.0f B: %.0f a second, bare %.0f, ratio %.2f; processor time of the server %.1f and %.1f µs, ratio %.2f; 99th percentile %.2f and %.2f ms, ratio %.2f\n",
			connections, rounds, asks, median(sizes), median(rate[0]), median(rate[1]), median(rate[0])/median(rate[1]),
			perAsk(cpu[0], rounds*asks), perAsk(cpu[1], rounds*asks), float64(cpu[1])/float64(cpu[0]),
			median(p99[0]), median(p99[1]), median(p99[0])/median(p99[1]))
	}
}

func perAsk(d time.Duration, n int) float64 { return float64(d.Microseconds()) / float64(n) }

// load asks for places over several connections and returns the requests a second and
// the 99th percentile of their time in ms.
func load(addr string, connections, asks int) (rate, p99ms float64) {
	took := make([]float64, asks)
	var wg sync.WaitGroup
	began := time.Now()
	for k := range connections {
		c, err := dial(addr)
		if err != nil {
			log.Fatal(err)
		}
		wg.Go(func() {
			defer c.conn.Close()
			for i := k; i < asks; i += connections {
				start := time.Now()
				if status, _, err := c.get(placePath(i)); err != nil || status != http.StatusOK {
					log.Fatal(status, err)
				}
				took[i] = float64(time.Since(start).Microseconds()) / 1000
			}
		})
	}
	wg.Wait()
	return float64(asks) / time.Since(began).Seconds(), quantile(took, 0.99)
}

// discard reads to the end and returns how many bytes came.
func discard(r io.Reader) int64 {
	n, err := io.Copy(io.Discard, r)
	if err != nil {
		log.Fatal(err)
	}
	return n
}
