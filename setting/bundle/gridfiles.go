package bundle

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"fmt"
	"io"
	"strconv"
	"strings"

	"nearmargin/setting/slab"
)

// grid reads a slab's layers; Depth is nil where it has no grid.
func (r *reader) grid(id string) (slab.Layers, error) {
	var l slab.Layers
	for _, f := range [...]struct {
		name string
		into **slab.Layer
	}{{"depth", &l.Depth}, {"sigma", &l.Sigma}, {"dip", &l.Dip}, {"strike", &l.Strike}, {"thickness", &l.Thickness}} {
		name := "slabs/" + id + "/" + f.name + ".xyz"
		raw, err := r.file(name, true)
		if err == nil && raw == nil {
			name += ".gz"
			raw, err = r.file(name, true)
		}
		if err != nil {
			return l, err
		}
		if raw == nil {
			continue
		}
		r.grids[name] = raw
		text := io.Reader(bytes.NewReader(raw))
		if strings.HasSuffix(name, ".gz") {
			z, err := gzip.NewReader(text)
			if err != nil {
				return l, &FileError{File: name, Err: err}
			}
			text = io.LimitReader(z, maxFileBytes*4)
		}
		if *f.into, err = readLayer(name, text); err != nil {
			return l, err
		}
	}
	return l, nil
}

// readLayer reads lon,lat,value lines in any order, on a regular grid; a value of
// NaN, or a node left out, has none.
func readLayer(name string, text io.Reader) (*slab.Layer, error) {
	var nodes []slab.Node
	sc := bufio.NewScanner(text)
	for line := 1; sc.Scan(); line++ {
		s := strings.TrimSpace(sc.Text())
		if s == "" {
			continue
		}
		n, err := parseNode(s)
		if err != nil {
			return nil, fault(name, line, "%v", err)
		}
		if nodes = append(nodes, n); len(nodes) > slab.MaxNodes {
			return nil, fault(name, line, "more than %d nodes", slab.MaxNodes)
		}
	}
	if err := sc.Err(); err != nil {
		return nil, &FileError{File: name, Err: err}
	}
	l, err := slab.LayOut(nodes)
	if err != nil {
		return nil, &FileError{File: name, Err: err}
	}
	return l, nil
}

func parseNode(s string) (slab.Node, error) {
	f := strings.FieldsFunc(s, func(r rune) bool { return r == ',' || r == ' ' || r == '\t' })
	if len(f) != 3 {
		return slab.Node{}, fmt.Errorf("%q has %d numbers; want lon,lat,value", s, len(f))
	}
	var x [3]float64
	for i := range f {
		var err error
		if x[i], err = strconv.ParseFloat(f[i], 64); err != nil {
			return slab.Node{}, fmt.Errorf("%q is not a number", f[i])
		}
	}
	if !(x[0] >= -180 && x[0] <= 360) || !(x[1] >= -90 && x[1] <= 90) {
		return slab.Node{}, fmt.Errorf("%g, %g is not a longitude and a latitude", x[0], x[1])
	}
	return slab.Node{Lon: x[0], Lat: x[1], Value: x[2]}, nil
}
