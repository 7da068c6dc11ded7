//go:build linux

package main

import (
	"bufio"
	"fmt"
	"io"
	"log"
	"math"
	"math/rand/v2"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"syscall"
	"time"
)

// form is a format of batches.
type form struct{ name, media string }

var forms = []form{{"csv", "text/csv"}, {"ndjson", "application/x-ndjson"}, {"geojson", "application/geo+json"}}

// write writes n random places.
func (f form) write(w io.Writer, n int) {
	b := bufio.NewWriterSize(w, 64<<10)
	r := rand.New(rand.NewPCG(1, 2))
	switch f.name {
	case "csv":
		b.WriteString("id,lon,lat\n")
	case "geojson":
		b.WriteString(`{"type":"FeatureCollection","features":[`)
	}
	for i := range n {
		lon, lat := r.Float64()*360-180, math.Asin(2*r.Float64()-1)*180/math.Pi
		switch f.name {
		case "csv":
			fmt.Fprintf(b, "%d,%.4f,%.4f\n", i, lon, lat)
		case "ndjson":
			fmt.Fprintf(b, `{"id":%d,"lon":%.4f,"lat":%.4f}`+"\n", i, lon, lat)
		default:
			if i > 0 {
				b.WriteString(",\n")
			}
			fmt.Fprintf(b, `{"type":"Feature","properties":{"id":%d},"geometry":{"type":"Point","coordinates":[%.4f,%.4f]}}`, i, lon, lat)
		}
	}
	if f.name == "geojson" {
		b.WriteString("]}\n")
	}
	b.Flush() // a fault shows at the reader
}

func (f form) file(dir string, n int) string {
	name := filepath.Join(dir, fmt.Sprintf("%d.%s", n, f.name))
	w, err := os.Create(name)
	if err != nil {
		log.Fatal(err)
	}
	f.write(w, n)
	if err := w.Close(); err != nil {
		log.Fatal(err)
	}
	return name
}

// annotate runs the command line on a file and returns its time on the wall, that of
// the processors, and the largest resident size in MB.
func annotate(f form, in io.Reader) (wall, cpu time.Duration, mb float64) {
	cmd := exec.Command(*program, "annotate", "--format", f.name)
	cmd.Stdin = in
	began := time.Now()
	if err := cmd.Run(); err != nil {
		log.Fatal(err)
	}
	wall = time.Since(began)
	usage := cmd.ProcessState.SysUsage().(*syscall.Rusage)
	return wall, cmd.ProcessState.UserTime() + cmd.ProcessState.SystemTime(), float64(usage.Maxrss) / 1000
}

// post sends a file as a batch and reads the answer.
func post(f form, in io.Reader) (wall time.Duration) {
	began := time.Now()
	res, err := http.Post("http://"+oursAddr+"/v1/annotate", f.media, in)
	if err != nil {
		log.Fatal(err)
	}
	discard(res.Body)
	res.Body.Close()
	if res.StatusCode != http.StatusOK || res.Trailer.Get("Nearmargin-Row-Errors") != "0" {
		log.Fatal(res.Status, res.Trailer)
	}
	return time.Since(began)
}

// stream compares batches over HTTP with the command line.
func stream() {
	const rows, rounds = 100_000, 11
	dir, err := os.MkdirTemp("", "served")
	if err != nil {
		log.Fatal(err)
	}
	defer os.RemoveAll(dir)
	server := launch(oursAddr, *program, "serve", "--listen", oursAddr)
	defer server.stop()
	for _, f := range forms {
		name := f.file(dir, rows)
		open := func() *os.File {
			in, err := os.Open(name)
			if err != nil {
				log.Fatal(err)
			}
			return in
		}
		time.Sleep(time.Second) // since the last request for a place
		var wall, cpu [2][]float64
		for range rounds {
			in := open()
			w, c, _ := annotate(f, in)
			in.Close()
			wall[0], cpu[0] = append(wall[0], w.Seconds()), append(cpu[0], c.Seconds())
			in = open()
			before := server.cpu()
			wall[1] = append(wall[1], post(f, in).Seconds())
			cpu[1] = append(cpu[1], (server.cpu() - before).Seconds())
			in.Close()
		}
		fmt.Printf("stream, %s, %d rows: command line %.0f rows a second, over HTTP %.0f, ratio %.2f; processor time %.1f and %.1f µs a row, ratio %.2f\n",
			f.name, rows, rows/median(wall[0]), rows/median(wall[1]), median(wall[0])/median(wall[1]),
			median(cpu[0])*1e6/rows, median(cpu[1])*1e6/rows, median(cpu[0])/median(cpu[1]))
	}
}

// memory measures the largest resident size over more and more rows: of the command
// line, and of a server whose client reads slowly.
func memory() {
	for _, f := range forms {
		for n := 100_000; n <= *most; n *= 10 {
			in, out, err := os.Pipe()
			if err != nil {
				log.Fatal(err)
			}
			go func() {
				f.write(out, n)
				out.Close()
			}()
			wall, cpu, mb := annotate(f, in)
			in.Close()
			fmt.Printf("memory, %s, %d rows: %.1f MB resident at most, %.1f s, %.1f µs of processor a row\n", f.name, n, mb, wall.Seconds(), cpu.Seconds()*1e6/float64(n))
		}
	}
	for _, f := range forms {
		server := launch(oursAddr, *program, "serve", "--listen", oursAddr)
		in, out := io.Pipe()
		go func() {
			f.write(out, 1_000_000)
			out.Close()
		}()
		res, err := http.Post("http://"+oursAddr+"/v1/annotate", f.media, in)
		if err != nil {
			log.Fatal(err)
		}
		const slowBytes, pause = 64 << 10, 20 * time.Millisecond // 3 MB a second
		got := 0
		for end := time.Now().Add(20 * time.Second); time.Now().Before(end); time.Sleep(pause) {
			n, err := io.CopyN(io.Discard, res.Body, slowBytes)
			if got += int(n); err != nil {
				break
			}
		}
		fmt.Printf("memory, %s, a client that reads 3 MB a second for 20 s (%d MB read): server %.1f MB resident at most\n", f.name, got>>20, server.status("VmHWM"))
		res.Body.Close()
		in.Close()
		server.stop()
	}
}

// start measures the time from exec to the first answer.
func start() {
	arg := []string{"serve", "--listen", oursAddr}
	if *model != "" {
		arg = append(arg, "--model", *model)
	}
	var took, sizes, points []float64
	for range 11 {
		began := time.Now()
		p := begin(oursAddr, exec.Command(*program, arg...))
		for {
			if status, _, err := ask(oursAddr, placePath(1)); err == nil && status == http.StatusOK {
				break
			}
			if time.Since(began) > time.Minute {
				log.Fatal("no answer within a minute")
			}
			time.Sleep(time.Millisecond)
		}
		took = append(took, time.Since(began).Seconds()*1000)
		sizes = append(sizes, p.status("VmHWM"))
		p.stop()
		began = time.Now()
		once := []string{"point", "-72.4", "-36.1"}
		if *model != "" {
			once = append(once, "--model", *model)
		}
		if err := exec.Command(*program, once...).Run(); err != nil {
			log.Fatal(err)
		}
		points = append(points, time.Since(began).Seconds()*1000)
	}
	fmt.Printf("start, model %q: first answer %.0f ms after exec, %.1f MB resident at most; the command line's point in %.0f ms (medians of %d)\n", *model, median(took), median(sizes), median(points), len(took))
}
