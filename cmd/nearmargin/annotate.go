package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"

	"golang.org/x/term"

	"nearmargin/api/annotate"
	"nearmargin/setting"
)

func annotateFlags(f *flags) {
	f.modelFlag()
	f.motionFlags()
	enrichFlags(f)
	f.set.StringVar(&f.out, "out", "", "output `file`; standard output where empty")
	f.set.StringVar(&f.format, "format", "", "`csv`, ndjson or geojson; after the file's ending where empty")
	f.set.StringVar(&f.lonColumn, "lon-column", "", "`column` of longitudes; found by name where empty")
	f.set.StringVar(&f.latColumn, "lat-column", "", "`column` of latitudes; found by name where empty")
	f.set.StringVar(&f.depthColumn, "depth-column", "", "`column` of depths, positive down; @z: a feature's third coordinate")
	f.set.StringVar(&f.depthUnit, "depth-unit", annotate.UnitKm, "`unit` of depths and elevations: km, m or ft")
	f.set.StringVar(&f.depthDatum, "depth-datum", annotate.SeaLevel, "what depths are counted `from`: sea_level or ground")
	f.set.StringVar(&f.elevationColumn, "elevation-column", "", "`column` of the ground's elevation above sea level, for depths from ground")
	f.set.StringVar(&f.uncertaintyCol, "uncertainty-column", "", "`column` of 1σ of the position in km")
	f.set.StringVar(&f.prefix, "prefix", annotate.DefaultPrefix, "what stands before the `names` of added columns")
}

// formats are the formats after the ending of a file's name.
var formats = map[string]annotate.Format{
	".csv": annotate.CSV, ".tsv": annotate.CSV, ".txt": annotate.CSV,
	".ndjson": annotate.NDJSON, ".jsonl": annotate.NDJSON,
	".geojson": annotate.GeoJSON, ".json": annotate.GeoJSON,
}

func (f *flags) annotateFormat(file string) (annotate.Format, error) {
	switch g := annotate.Format(f.format); g {
	case annotate.CSV, annotate.NDJSON, annotate.GeoJSON:
		return g, nil
	case "":
	default:
		return "", usageError("--format %q is unknown; want csv, ndjson or geojson", f.format)
	}
	if file == "-" {
		return annotate.CSV, nil
	}
	ending := strings.ToLower(filepath.Ext(file))
	g, ok := formats[ending]
	if !ok {
		return "", usageError("the ending %q of %s names no format; give --format csv, ndjson or geojson", ending, file)
	}
	return g, nil
}

// annotateFile annotates a file, or a table where one is named.
func annotateFile(p *program, ctx context.Context, f *flags) error {
	if f.wantsTable() {
		return annotateTable(p, ctx, f)
	}
	if err := f.wantArgs(0, 1); err != nil {
		return err
	}
	file := "-"
	if len(f.args) == 1 {
		file = f.args[0]
	}
	format, err := f.annotateFormat(file)
	if err != nil {
		return err
	}
	b, err := load(f.model)
	if err != nil {
		return err
	}
	l, err := b.Model.Lookup(setting.Options{Motion: f.motion, Fallback: f.fallback, Brief: format == annotate.CSV})
	if err != nil {
		return usageError("%v", err)
	}
	in := p.stdin
	if file != "-" {
		r, err := os.Open(file) // #nosec G703 -- the operator's own path
		if err != nil {
			return err
		}
		defer r.Close()
		in = r
	}
	o := annotate.Options{
		Lookup: l, LonColumn: f.lonColumn, LatColumn: f.latColumn, DepthColumn: f.depthColumn,
		UncertaintyColumn: f.uncertaintyCol, Prefix: f.prefix,
		DepthUnit: f.depthUnit, DepthDatum: f.depthDatum, ElevationColumn: f.elevationColumn, Progress: p.progress(),
	}
	var st annotate.Stats
	err = p.writeOut(f.out, func(w io.Writer) error {
		st, err = annotate.Run(ctx, in, w, format, o)
		return err
	})
	switch {
	case err != nil:
		return err
	case st.Errors > 0:
		return fmt.Errorf("%w: %d of %d", errRows, st.Errors, st.Rows)
	}
	return nil
}

// progress returns a function that shows how far the work has come, at most
// twice a second, where standard error is a terminal; nil elsewhere.
func (p *program) progress() func(annotate.Stats) {
	f, ok := p.stderr.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		return nil
	}
	start := time.Now()
	last := start
	return func(st annotate.Stats) {
		now := time.Now()
		if now.Sub(last) < 500*time.Millisecond {
			return
		}
		last = now
		fmt.Fprintf(f, "\r%d rows, %d with an error, %.0f rows/s", st.Rows, st.Errors, float64(st.Rows)/now.Sub(start).Seconds())
	}
}
