package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"unique"

	"nearmargin/api/annotate"
	"nearmargin/api/figure"
	"nearmargin/api/page"
	"nearmargin/setting/sphere"
)

func mapFlags(f *flags) {
	f.modelFlag()
	readFlags(f)
	f.set.StringVar(&f.out, "out", "", "output `file`, .svg; standard output where empty")
	f.set.StringVar(&f.out, "o", "", "short for --out `file`")
	f.set.StringVar(&f.title, "title", "", "`title` of the map; the file's name where empty")
}

// readFlags are the flags of commands that read an annotated file.
func readFlags(f *flags) {
	f.set.StringVar(&f.format, "format", "", "`csv`, ndjson or geojson; after the file's ending where empty")
	f.set.StringVar(&f.lonColumn, "lon-column", "", "`column` of longitudes; found by name where empty")
	f.set.StringVar(&f.latColumn, "lat-column", "", "`column` of latitudes; found by name where empty")
	f.set.StringVar(&f.prefix, "prefix", annotate.DefaultPrefix, "what stands before the `names` of added columns")
}

// readAnnotated reads the annotated file that the arguments name.
func (p *program) readAnnotated(ctx context.Context, f *flags, each func(annotate.Row) error) (name string, err error) {
	if err := f.wantArgs(1, 1); err != nil {
		return "", err
	}
	file := f.args[0]
	format, err := f.annotateFormat(file)
	if err != nil {
		return "", err
	}
	in := p.stdin
	name = "standard input"
	if file != "-" {
		r, err := os.Open(file) // #nosec G703 G304 -- the operator's own path
		if err != nil {
			return "", err
		}
		defer r.Close()
		in, name = r, filepath.Base(file)
	}
	o := annotate.ReadOptions{LonColumn: f.lonColumn, LatColumn: f.latColumn, Prefix: f.prefix}
	err = annotate.Read(in, format, o, func(r annotate.Row) error {
		if err := ctx.Err(); err != nil {
			return err
		}
		return each(r)
	})
	if err != nil {
		return "", fmt.Errorf("%s: %w", name, err)
	}
	return name, nil
}

// mostOnMap bounds the sites of a map, which are held in memory.
const mostOnMap = 1_000_000

// drawMap draws an annotated file as a location map.
func drawMap(p *program, ctx context.Context, f *flags) error {
	spec := &figure.MapSpec{}
	var models []string
	areas := 0
	name, err := p.readAnnotated(ctx, f, func(r annotate.Row) error {
		if r.Model != "" && !slices.Contains(models, r.Model) {
			models = append(models, r.Model)
		}
		switch {
		case r.Area:
			areas++
		case r.Label == "" || math.IsNaN(r.Lon) || math.IsNaN(r.Lat):
			spec.Others++
		case len(spec.Sites) == mostOnMap:
			return fmt.Errorf("more than %d sites; draw a part of them", mostOnMap)
		default:
			at := sphere.LonLat{Lon: sphere.WrapLon(r.Lon), Lat: r.Lat}
			spec.Sites = append(spec.Sites, figure.MapSite{Name: strings.Clone(r.Name), At: at, Label: kept(r.Label), Family: kept(r.Family), Confidence: kept(r.Confidence)})
		}
		return nil
	})
	if err != nil {
		return err
	}
	if len(spec.Sites) == 0 {
		return fmt.Errorf("%s: no row has both a place and an answer", name)
	}
	b, err := load(f.model)
	if err != nil {
		return err
	}
	m := b.Model
	if spec.Title = f.title; spec.Title == "" {
		spec.Title = "Tectonic setting of the sites of " + name
	}
	spec.Boundaries = m.Network().Boundaries()
	if spec.Land, err = page.Land(len(spec.Sites) < 2 || near(spec.Sites)); err != nil {
		return err
	}
	spec.Caption = append(spec.Caption, fmt.Sprintf("Answers from %s; boundaries of %s (sha256 %.12s), %s, %s.", strings.Join(models, ", "), m.Ref(), m.SHA256(), m.Title(), m.Licence()))
	if areas > 0 {
		spec.Caption = append(spec.Caption, fmt.Sprintf("Areas, which are not drawn: %d.", areas))
	}
	spec.Caption = append(spec.Caption, m.Citations()...)
	spec.Caption = append(spec.Caption, "Land: Natural Earth. The setting is that of the present day. A screening aid on generalised models: for hazard, siting or drilling defer to national hazard models, local codes and licensed practice.")
	out := figure.Map(spec)
	return p.writeOut(f.out, func(w io.Writer) error {
		_, err := w.Write(out)
		return err
	})
}

// kept returns a text of which there are few, as the one copy of it.
func kept(s string) string { return unique.Make(s).Value() }

// near reports whether sites lie close enough together for the fine outline of land.
func near(sites []figure.MapSite) bool {
	first := sphere.FromLonLat(sites[0].At)
	for i := range sites {
		if sphere.Angle(first, sphere.FromLonLat(sites[i].At)) > 0.7 {
			return false
		}
	}
	return true
}
