package published

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"nearmargin/setting/slab"
)

// gridName is how the files of Hayes et al. (2018) are named: the zone, the layer
// and the date of the model.
var gridName = regexp.MustCompile(`^([a-z]{3})_slab2_(dep|unc|dip|str|thk)_([0-9.]+)\.xyz(\.gz)?$`)

// layerRange is what a layer's values may be, as published.
var layerRange = map[string]struct {
	what     string
	low, top float64
}{
	"dep": {"a depth in negative km", -800, 0},
	"unc": {"an uncertainty in km", 0, 400},
	"dip": {"a dip in degrees", 0, 90},
	"str": {"a strike in degrees", -360, 360},
	"thk": {"a thickness in km", 0, 300},
}

// Grids are the layers of one slab, in the project's form: depth in km positive
// down, cropped to where there is a depth.
type Grids struct {
	Zone, Date string
	File       string // of the depth
	slab.Layers
}

// ReadSlab2 reads grids of slabs (Hayes et al. 2018): every file of the list that
// is named ZONE_slab2_LAYER_DATE.xyz or .xyz.gz, lines of lon,lat,value with
// longitude 0…360 and depth in negative km. Files of another name are skipped, and
// returned by name. A slab needs its depth; a layer on other nodes is an error.
func ReadSlab2(files []File) (out []Grids, tallies []Tally, skipped []string, err error) {
	zones := map[string]*Grids{}
	var order []string
	for _, f := range files {
		m := gridName.FindStringSubmatch(f.base())
		if m == nil {
			skipped = append(skipped, f.Name)
			continue
		}
		zone, layer := m[1], m[2]
		if zones[zone] == nil {
			zones[zone] = &Grids{Zone: zone}
			order = append(order, zone)
		}
		l, t, err := readGrid(f, layer)
		tallies = append(tallies, t)
		if err != nil {
			return nil, tallies, skipped, err
		}
		into := zones[zone].layer(layer)
		if *into != nil {
			return nil, tallies, skipped, fmt.Errorf("%s: layer %s of slab %s was read from another file already; give one edition of each slab", f.Name, layer, zone)
		}
		*into = l
		if layer == "dep" {
			zones[zone].Date, zones[zone].File = m[3], f.Name
		}
	}
	slices.Sort(order)
	for _, zone := range order {
		g := zones[zone]
		if g.Depth == nil {
			return nil, tallies, skipped, fmt.Errorf("slab %s: there is no depth, %s_slab2_dep_DATE.xyz", zone, zone)
		}
		if _, err := slab.NewGrid(g.Layers); err != nil {
			return nil, tallies, skipped, fmt.Errorf("%s: slab %s: %w", g.File, zone, err)
		}
		g.Layers = g.Crop()
		out = append(out, *g)
	}
	return out, tallies, skipped, nil
}

func (g *Grids) layer(name string) **slab.Layer {
	switch name {
	case "dep":
		return &g.Depth
	case "unc":
		return &g.Sigma
	case "dip":
		return &g.Dip
	case "str":
		return &g.Strike
	}
	return &g.Thickness
}

func readGrid(f File, layer string) (*slab.Layer, Tally, error) {
	t := Tally{File: f.Name}
	text, closeIt, err := textOf(f)
	if err != nil {
		return nil, t, err
	}
	var nodes []slab.Node
	err = eachLine(f.Name, text, func(line int, s string) {
		n, err := parseGridLine(s, layer)
		if err != nil {
			t.reject(line, "%v", err)
			return
		}
		t.Read++
		if len(nodes) <= slab.MaxNodes {
			nodes = append(nodes, n)
		}
	})
	if err = errors.Join(err, closeIt()); err != nil {
		return nil, t, fmt.Errorf("%s: %w", f.Name, err)
	}
	l, err := slab.LayOut(nodes)
	if err != nil {
		return nil, t, fmt.Errorf("%s: %w%s", f.Name, err, t.first())
	}
	return l, t, nil
}

// first returns the first line at fault, for the message of an error that it may
// have caused.
func (t *Tally) first() string {
	if len(t.Rejects) == 0 {
		return ""
	}
	return fmt.Sprintf(" (%d lines were rejected, the first: %v)", t.Rejected, t.Rejects[0])
}

func parseGridLine(s, layer string) (slab.Node, error) {
	var n slab.Node
	rest := s
	for i, into := range [...]*float64{&n.Lon, &n.Lat, &n.Value} {
		field, more, found := strings.Cut(rest, ",")
		if found != (i < 2) {
			return n, fmt.Errorf("%.60q is not lon,lat,value", s)
		}
		rest = more
		field = strings.TrimSpace(field)
		var err error
		if *into, err = strconv.ParseFloat(field, 64); err != nil {
			return n, fmt.Errorf("%.40q is not a number", field)
		}
	}
	if !(n.Lon >= -180 && n.Lon <= 360) || !(n.Lat >= -90 && n.Lat <= 90) {
		return n, fmt.Errorf("%g, %g is not a longitude and a latitude", n.Lon, n.Lat)
	}
	if math.IsNaN(n.Value) {
		return n, nil
	}
	if r := layerRange[layer]; !(n.Value >= r.low && n.Value <= r.top) {
		return n, fmt.Errorf("%g is not %s, within %g and %g", n.Value, r.what, r.low, r.top)
	}
	switch layer {
	case "dep":
		n.Value = 0 - n.Value // positive down; 0 and not -0
	case "str":
		n.Value = math.Mod(n.Value+360, 360)
	}
	return n, nil
}
