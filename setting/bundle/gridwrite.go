package bundle

import (
	"bytes"
	"compress/gzip"
	"math"
	"strconv"

	"nearmargin/setting/slab"
)

// writeLayers returns the files of a gridded slab, compressed, without a time or
// a name in their heads, so that the same grid gives the same bytes. They hold
// the nodes with a depth, in rows from north to south; values are rounded to
// three decimals, a metre of depth.
func writeLayers(l slab.Layers) map[string][]byte {
	out := map[string][]byte{}
	for _, f := range [...]struct {
		name  string
		layer *slab.Layer
	}{{"depth", l.Depth}, {"sigma", l.Sigma}, {"dip", l.Dip}, {"strike", l.Strike}, {"thickness", l.Thickness}} {
		if f.layer != nil {
			out[f.name+".xyz.gz"] = writeLayer(l.Depth, f.layer)
		}
	}
	return out
}

func writeLayer(depth, l *slab.Layer) []byte {
	var out bytes.Buffer
	z, _ := gzip.NewWriterLevel(&out, gzip.BestCompression) // the level is a constant and valid
	var line []byte
	for row := l.Rows - 1; row >= 0; row-- {
		for col := range l.Cols {
			i := row*l.Cols + col
			if math.IsNaN(float64(depth.Values[i])) {
				continue
			}
			line = appendRounded(line[:0], l.West+float64(col)*l.Step, 1e6)
			line = appendRounded(append(line, ','), l.South+float64(row)*l.Step, 1e6)
			line = appendRounded(append(line, ','), float64(l.Values[i]), 1e3)
			_, _ = z.Write(append(line, '\n')) // a bytes.Buffer takes all
		}
	}
	_ = z.Close()
	return out.Bytes()
}

// appendRounded appends a number rounded to 1/scale, without idle zeros.
func appendRounded(b []byte, x, scale float64) []byte {
	return strconv.AppendFloat(b, math.Round(x*scale)/scale+0, 'f', -1, 64)
}
