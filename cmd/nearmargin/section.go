package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strings"

	"nearmargin/api/figure"
	"nearmargin/api/wire"
	"nearmargin/setting"
)

func sectionFlags(f *flags) {
	f.modelFlag()
	f.motionFlags()
	f.set.Var(&f.depthKm, "depth-km", "depth of the site in `km`, positive down from sea level")
	f.set.StringVar(&f.out, "out", "", "output `file`, .svg or .json; standard output where empty")
	f.set.StringVar(&f.format, "format", "", "`svg` or json; after the file's ending where empty, svg on standard output")
}

// The formats of a section.
const (
	sectionSVG  = "svg"
	sectionJSON = "json"
)

func (f *flags) sectionFormat() (string, error) {
	switch f.format {
	case sectionSVG, sectionJSON:
		return f.format, nil
	case "":
	default:
		return "", usageError("--format %q is unknown; want svg or json", f.format)
	}
	switch ending := strings.ToLower(filepath.Ext(f.out)); {
	case f.out == "" || ending == ".svg":
		return sectionSVG, nil
	case ending == ".json":
		return sectionJSON, nil
	}
	return "", usageError("the ending of %s names no format; give --format svg or json", f.out)
}

// section draws the slab along a line through a place.
func section(p *program, _ context.Context, f *flags) error {
	site, err := f.site()
	if err != nil {
		return err
	}
	format, err := f.sectionFormat()
	if err != nil {
		return err
	}
	b, err := load(f.model)
	if err != nil {
		return err
	}
	l, err := b.Model.Lookup(setting.Options{Motion: f.motion, Fallback: f.fallback})
	if err != nil {
		return usageError("%v", err)
	}
	s, err := l.Section(site)
	var none *setting.NoSlabError
	switch {
	case errors.As(err, &none):
		return fmt.Errorf("%g, %g: %w", site.Lon, site.Lat, err)
	case err != nil:
		return usageError("%v", err)
	}
	var out []byte
	if format == sectionSVG {
		out = figure.Section(s)
	} else {
		out = append(wire.AppendSection(nil, s), '\n')
	}
	return p.writeOut(f.out, func(w io.Writer) error {
		_, err := w.Write(out)
		return err
	})
}
