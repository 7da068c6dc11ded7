// Command bench measures how cost grows with rows, with segments and with batches
// at once, and draws it: go run ./testdata/bench -dir testdata/bench
//
// It writes growth.tsv and growth.svg. Times are processor time, so that what else
// the machine does counts little; the program uses every core itself.
package main

import (
	"context"
	"flag"
	"fmt"
	"io"
	"log"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"sync"

	"nearmargin/api/annotate"
	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/builtin"
	"nearmargin/setting/sphere"
	"nearmargin/testdata/bench/rounds"
)

// series is one line of the plot.
type series struct {
	title, x, y string
	xs, ys      []float64
}

func main() {
	dir := flag.String("dir", ".", "`directory` for growth.tsv and growth.svg")
	most := flag.Int("rows", 1_000_000, "the largest `number` of rows")
	flag.Parse()
	b, err := builtin.Load()
	if err != nil {
		log.Fatal(err)
	}
	l, err := b.Model.Lookup(setting.Options{Brief: true})
	if err != nil {
		log.Fatal(err)
	}
	all := []series{rows(l, *most), segments(), batches(l)}
	var tsv strings.Builder
	for _, s := range all {
		fmt.Fprintf(&tsv, "# %s\n%s\t%s\n", s.title, s.x, s.y)
		for i := range s.xs {
			fmt.Fprintf(&tsv, "%g\t%.3g\n", s.xs[i], s.ys[i])
		}
	}
	for name, text := range map[string]string{"growth.tsv": tsv.String(), "growth.svg": draw(all)} {
		if err := os.WriteFile(filepath.Join(*dir, name), []byte(text), 0o644); err != nil {
			log.Fatal(err)
		}
	}
}

// table is a CSV of n random places, made while it is read.
type table struct {
	r    *rand.Rand
	left int
	buf  []byte
}

func newTable(n int) *table {
	return &table{rand.New(rand.NewPCG(1, 2)), n, []byte("id,lon,lat\n")}
}

func (t *table) Read(p []byte) (int, error) {
	for len(t.buf) < len(p) && t.left > 0 {
		lat := math.Asin(2*t.r.Float64()-1) * 180 / math.Pi
		t.buf = fmt.Appendf(t.buf, "%d,%.4f,%.4f\n", t.left, t.r.Float64()*360-180, lat)
		t.left--
	}
	n := copy(p, t.buf)
	if t.buf = t.buf[n:]; n == 0 {
		return 0, io.EOF
	}
	return n, nil
}

func annotated(l *setting.Lookup, n int) {
	st, err := annotate.Run(context.Background(), newTable(n), io.Discard, annotate.CSV, annotate.Options{Lookup: l})
	if err != nil || st.Rows != int64(n) || st.Errors != 0 {
		log.Fatal(st, err)
	}
}

func rows(l *setting.Lookup, most int) series {
	s := series{title: "CSV, whole answers", x: "rows", y: "µs of processor a row"}
	for n := 1000; n <= most; n *= 10 {
		times := max(1, min(11, 1_000_000/n))
		ns := rounds.ProcessMedians(times, 1, func(int) { annotated(l, n) })
		s.xs, s.ys = append(s.xs, float64(n)), append(s.ys, ns[0]/1e3/float64(n))
	}
	return s
}

// lunes returns a network of 24 plates between wavy lines from pole to pole.
func lunes(segments int) *boundary.Network {
	const lines = 24
	var list []*boundary.Boundary
	for i := range lines {
		n := max(4, segments/lines)
		path := []sphere.LonLat{{Lon: 0, Lat: -90}}
		for k := 1; k < n; k++ {
			lat := -90 + 180*float64(k)/float64(n)
			path = append(path, sphere.LonLat{Lon: sphere.WrapLon(float64(i)*360/lines + 4*math.Sin(lat/7+float64(i))), Lat: lat})
		}
		b, err := boundary.New(boundary.Spec{
			ID: fmt.Sprintf("line-%02d", i), Name: fmt.Sprintf("Line %d", i), Type: boundary.SpreadingRidge,
			Left: fmt.Sprintf("P%02d", (i+lines-1)%lines), Right: fmt.Sprintf("P%02d", i), SigmaKm: 5,
			Source: "made up", SourceStatus: boundary.FromMemory, Path: append(path, sphere.LonLat{Lon: 0, Lat: 90}),
		})
		if err != nil {
			log.Fatal(err)
		}
		list = append(list, b)
	}
	n, err := boundary.NewNetwork(list)
	if err != nil {
		log.Fatal(err)
	}
	return n
}

func segments() series {
	s := series{title: "plate, nearest boundary, distance on WGS84", x: "segments", y: "µs of processor a place"}
	r := rand.New(rand.NewPCG(3, 4))
	var places [4096]boundary.Place
	for i := range places {
		places[i] = boundary.PlaceAt(sphere.LonLat{Lon: r.Float64()*360 - 180, Lat: math.Asin(2*r.Float64()-1) * 180 / math.Pi})
	}
	for _, want := range []int{100, 1000, 10_000, 100_000} {
		n := lunes(want)
		ns := rounds.Medians(51, rounds.Slice, func(i int) {
			if _, h := n.Locate(places[i%len(places)]); h.Boundary == nil {
				log.Fatal("nothing near ", places[i%len(places)])
			}
		})
		s.xs, s.ys = append(s.xs, float64(n.NumLegs())), append(s.ys, ns[0]/1e3)
	}
	return s
}

func batches(l *setting.Lookup) series {
	s := series{title: "CSV batches of 5,000 rows at once", x: "batches", y: "µs of processor a row"}
	const n = 5000
	for k := 1; k <= 32; k *= 2 {
		ns := rounds.ProcessMedians(11, 1, func(int) {
			var wg sync.WaitGroup
			for range k {
				wg.Go(func() { annotated(l, n) })
			}
			wg.Wait()
		})
		s.xs, s.ys = append(s.xs, float64(k)), append(s.ys, ns[0]/1e3/float64(n*k))
	}
	return s
}

// draw makes one panel a series, with logarithmic axes.
func draw(all []series) string {
	const w, h, left, top, gap = 300.0, 220.0, 60.0, 40.0, 70.0
	var b strings.Builder
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" width="%g" height="%g" font-family="sans-serif" font-size="11">`+"\n",
		left+float64(len(all))*(w+gap), top+h+60)
	b.WriteString(`<rect width="100%" height="100%" fill="#fff"/>` + "\n")
	for k, s := range all {
		x0 := left + float64(k)*(w+gap)
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, y := range s.ys {
			lo, hi = min(lo, y), max(hi, y)
		}
		lo, hi = math.Floor(math.Log10(lo)), math.Ceil(math.Log10(hi)+1e-9)
		x1, x2 := math.Log10(s.xs[0]), math.Log10(s.xs[len(s.xs)-1])
		at := func(x, y float64) (float64, float64) {
			return x0 + w*(math.Log10(x)-x1)/(x2-x1), top + h*(1-(math.Log10(y)-lo)/(hi-lo))
		}
		fmt.Fprintf(&b, `<text x="%.1f" y="%.1f" font-weight="bold">%s</text>`+"\n", x0, top-22, s.title)
		fmt.Fprintf(&b, `<text x="%.1f" y="%.1f">%s</text>`+"\n", x0, top-8, s.y)
		fmt.Fprintf(&b, `<rect x="%.1f" y="%.1f" width="%g" height="%g" fill="none" stroke="#888"/>`+"\n", x0, top, w, h)
		for e := lo; e <= hi; e++ {
			_, y := at(s.xs[0], math.Pow(10, e))
			fmt.Fprintf(&b, `<line x1="%.1f" y1="%.1f" x2="%.1f" y2="%.1f" stroke="#ddd"/><text x="%.1f" y="%.1f" text-anchor="end">%g</text>`+"\n", x0, y, x0+w, y, x0-5, y+4, math.Pow(10, e))
		}
		var line strings.Builder
		for i := range s.xs {
			x, y := at(s.xs[i], s.ys[i])
			fmt.Fprintf(&line, "%.1f,%.1f ", x, y)
			fmt.Fprintf(&b, `<circle cx="%.1f" cy="%.1f" r="3" fill="#06c"/><text x="%.1f" y="%.1f" text-anchor="middle">%g</text><text x="%.1f" y="%.1f" text-anchor="middle" fill="#06c">%.3g</text>`+"\n", x, y, x, top+h+16, s.xs[i], x, y-8, s.ys[i])
		}
		fmt.Fprintf(&b, `<polyline points="%s" fill="none" stroke="#06c" stroke-width="1.5"/>`+"\n", strings.TrimSpace(line.String()))
		fmt.Fprintf(&b, `<text x="%.1f" y="%.1f" text-anchor="middle">%s</text>`+"\n", x0+w/2, top+h+34, s.x)
	}
	return b.String() + "</svg>\n"
}
