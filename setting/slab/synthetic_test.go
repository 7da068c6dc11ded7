package slab

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

// kmPerDeg is the length of a degree of a great circle.
var kmPerDeg = sphere.RadToKm(math.Pi / 180)

func at(lon, lat float64) sphere.Vec { return sphere.FromLonLat(sphere.LonLat{Lon: lon, Lat: lat}) }

func must[T any](tb testing.TB) func(v T, err error) T {
	return func(v T, err error) T {
		tb.Helper()
		if err != nil {
			tb.Fatal(err)
		}
		return v
	}
}

// parallel returns a contour along a parallel of latitude from one longitude to
// another, with a vertex every tenth of a degree, so that the arcs between them
// leave the parallel by less than a metre below 2° of latitude.
func parallel(depthKm, sigmaKm, fromLon, toLon, lat float64) Contour {
	c := Contour{DepthKm: depthKm, SigmaKm: sigmaKm}
	n := int(math.Round(math.Abs(toLon-fromLon) * 10))
	for i := range n + 1 {
		lon := fromLon + (toLon-fromLon)*float64(i)/float64(n)
		c.Path = append(c.Path, sphere.LonLat{Lon: sphere.WrapLon(lon), Lat: lat})
	}
	return c
}

// southward is a slab that goes down to the south from the equator, 4° wide: 10 km
// deep on the equator, 50 km at 1° S, 170 km at 2° S.
func southward(tb testing.TB, westLon float64) Surface {
	tb.Helper()
	return must[Surface](tb)(NewContours([]Contour{
		parallel(10, 2, westLon, westLon+4, 0), parallel(50, 6, westLon, westLon+4, -1), parallel(170, 12, westLon, westLon+4, -2),
	}))
}

// around returns the place at an angle and an azimuth from a centre.
func around(centre sphere.Vec, azimuthDeg, angleDeg float64) sphere.Vec {
	east, north := centre.EastNorth()
	sin, cos := math.Sincos(azimuthDeg * math.Pi / 180)
	return centre.Scale(math.Cos(angleDeg * math.Pi / 180)).Add(east.Scale(sin * math.Sin(angleDeg*math.Pi/180))).Add(north.Scale(cos * math.Sin(angleDeg*math.Pi/180)))
}

// curved is a surface whose contours are wavy arcs around a centre, the deeper
// the nearer to it or the farther from it.
type curved struct {
	surface  Surface
	contours []Contour
	where    func(contour, along float64) sphere.Vec // contour 0…n-1, along 0…1
}

func genCurved() *rapid.Generator[curved] {
	return rapid.Custom(func(t *rapid.T) curved {
		centre := at(rapid.SampledFrom([]float64{-180, -71.3, 0.1, 90, 179.8}).Draw(t, "lon"), rapid.Float64Range(-70, 70).Draw(t, "lat"))
		inward := rapid.Bool().Draw(t, "inward")
		n := rapid.IntRange(2, 5).Draw(t, "contours")
		gapDeg := rapid.Float64Range(0.3, 1.2).Draw(t, "gap")
		dipDeg := rapid.Float64Range(10, 65).Draw(t, "dip")
		startDeg := rapid.Float64Range(0, 360).Draw(t, "start")
		spanDeg := rapid.Float64Range(40, 120).Draw(t, "span")
		waves := rapid.Float64Range(0, 2).Draw(t, "waves")
		wave := 0.12 * gapDeg
		where := func(contour, along float64) sphere.Vec {
			r := 2 + gapDeg*contour
			az := startDeg - spanDeg*along
			if inward {
				r = 2 + gapDeg*(float64(n-1)-contour)
				az = startDeg + spanDeg*along
			}
			return around(centre, az, r+wave*math.Sin(2*math.Pi*waves*along+contour))
		}
		out := curved{where: where}
		for i := range n {
			c := Contour{DepthKm: 10 + float64(i)*gapDeg*kmPerDeg*math.Tan(dipDeg*math.Pi/180), SigmaKm: 5 + float64(i)}
			for j := range 13 {
				c.Path = append(c.Path, where(float64(i), float64(j)/12).LonLat())
			}
			if c.DepthKm > 700 {
				break
			}
			out.contours = append(out.contours, c)
		}
		if len(out.contours) < 2 {
			t.Skip("too steep")
		}
		var err error
		if out.surface, err = NewContours(out.contours); err != nil {
			t.Fatalf("%v: %+v", err, out.contours)
		}
		return out
	})
}

// layer fills a layer with a function of longitude and latitude.
func layer(west, south, step float64, cols, rows int, f func(lon, lat float64) float64) *Layer {
	l := &Layer{West: west, South: south, Step: step, Cols: cols, Rows: rows}
	for row := range rows {
		for col := range cols {
			l.Values = append(l.Values, float32(f(west+float64(col)*step, south+float64(row)*step)))
		}
	}
	return l
}

// genGrid draws a smooth gridded surface without holes, and a place inside.
func genGrid() *rapid.Generator[Surface] {
	return rapid.Custom(func(t *rapid.T) Surface {
		west := rapid.SampledFrom([]float64{-75, 178, 359, 0}).Draw(t, "west")
		south := rapid.Float64Range(-60, 55).Draw(t, "south")
		slope := rapid.Float64Range(5, 110).Draw(t, "km/deg")
		az := rapid.Float64Range(0, 2*math.Pi).Draw(t, "azimuth")
		bend := rapid.Float64Range(-6, 6).Draw(t, "bend")
		sin, cos := math.Sincos(az)
		s, err := NewGrid(Layers{Depth: layer(west, south, 0.1, 31, 31, func(lon, lat float64) float64 {
			x, y := lon-west-1.5, lat-south-1.5
			return 260 + slope*(sin*x+cos*y) + bend*(x*x-y*y)
		})})
		if err != nil {
			t.Fatal(err)
		}
		return s
	})
}
