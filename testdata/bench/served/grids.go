//go:build linux

package main

import (
	"bufio"
	"compress/gzip"
	"fmt"
	"log"
	"math"
	"os"
	"path/filepath"
)

// generated are the slabs for which grids are made up, at about the place of each, so
// that with four real ones there are 23. Each goes down to the given azimuth.
var generated = []struct {
	code          string
	lon, lat, azi float64
}{
	{"alu", 195, 54, 330}, {"cal", 15, 39, 310}, {"cam", 268, 14, 30}, {"cot", 125.5, 7, 90}, {"hal", 128, 2, 270},
	{"hin", 70.5, 36.5, 180}, {"ker", 182, -28, 290}, {"kur", 150, 48, 310}, {"mak", 61, 27, 0}, {"man", 120, 18, 90},
	{"pam", 73, 38, 180}, {"phi", 127, 10, 270}, {"png", 145, -4, 200}, {"puy", 166.5, -46, 90}, {"ryu", 127, 27, 320},
	{"sam", 290, -22, 90}, {"sco", 331, -57, 270}, {"sol", 156, -7, 45}, {"sum", 103, -4, 30},
}

// writeGrids writes grids of 0.05° in the form of Hayes et al. (2018), five layers of
// each slab with 371 × 371 nodes, a fifth of them filled: as large as real ones. The
// surfaces are planes, made up.
func writeGrids(dir string) {
	layers := []struct {
		name  string
		value func(down float64) float64
	}{
		{"dep", func(down float64) float64 { return -(15 + down*0.7) }}, {"dip", func(float64) float64 { return 35 }},
		{"str", nil}, {"thk", func(float64) float64 { return 80 }}, {"unc", func(down float64) float64 { return 10 + down/50 }},
	}
	const nodes, step = 371, 0.05
	for _, g := range generated {
		sin, cos := math.Sincos(g.azi * math.Pi / 180)
		for _, l := range layers {
			f, err := os.Create(filepath.Join(dir, g.code+"_slab2_"+l.name+"_02.24.18.xyz.gz"))
			if err != nil {
				log.Fatal(err)
			}
			z := gzip.NewWriter(f)
			w := bufio.NewWriter(z)
			for j := range nodes {
				lat := g.lat + (float64(j)-nodes/2)*step
				for i := range nodes {
					lon := g.lon + (float64(i)-nodes/2)*step
					east, north := (lon-g.lon)*111.2*math.Cos(lat*math.Pi/180), (lat-g.lat)*111.2
					down, along := east*sin+north*cos, east*cos-north*sin
					value := math.NaN()
					if down >= 0 && down < 500 && math.Abs(along) < 800 {
						if value = math.Mod(g.azi+270, 360); l.value != nil {
							value = l.value(down)
						}
					}
					fmt.Fprintf(w, "%.2f,%.2f,%g\n", math.Mod(lon+360, 360), lat, value)
				}
			}
			for _, close := range []func() error{w.Flush, z.Close, f.Close} {
				if err := close(); err != nil {
					log.Fatal(err)
				}
			}
		}
	}
}
