package main

import (
	"fmt"
	"math"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/setting/slab"
	"time"
)

func main() {
	b, err := builtin.Load()
	if err != nil {
		panic(err)
	}
	l, _ := b.Model.Lookup(setting.Options{})
	for _, s := range b.Model.Slabs() {
		n, dip, tr, no, nonmono, fail := 0, 0, 0, 0, 0, 0
		var worst float64
		for _, c := range slab.Contours(s.Surface) {
			for i, p := range c.Path {
				if i == 0 || i == len(c.Path)-1 || i%2 == 0 {
					continue
				}
				t0 := time.Now()
				x, err := l.Section(setting.SiteAt(p.Lon, p.Lat))
				_ = t0
				if err != nil {
					fail++
					fmt.Println(s.ID, c.DepthKm, p, err)
					continue
				}
				if x.Slab != s {
					continue
				}
				n++
				switch {
				case !x.HasTrench:

					no++
				case x.Line.From == setting.FromDip:
					dip++
				default:
					tr++
				}
				prev := math.Inf(-1)
				bad := false
				for i := range x.Samples {
					if x.Profiles[0].Has(i) {
						z := x.Profiles[0].Readings[i].DepthKm
						if z < prev-1 {
							bad = true
							worst = max(worst, prev-z)
						}
						prev = z
					}
				}
				if bad {
					nonmono++
				}
			}
		}
		fmt.Printf("%-20s n %3d dip %3d trench %3d none %3d nonmono %3d worst %.0f fail %d\n", s.ID, n, dip, tr, no, nonmono, worst, fail)
	}
}
