package annotate

import (
	"context"
	"fmt"
	"io"
)

// Run copies the input to the output with answers added. It returns what it
// counted, also on an error. The error is an *InputError where the input is at
// fault as a whole; one that is met half way leaves what came before written.
func Run(ctx context.Context, in io.Reader, out io.Writer, f Format, o Options) (Stats, error) {
	if err := o.fill(); err != nil {
		return Stats{}, err
	}
	o.turn = turn{slots: o.Slots}
	defer o.turn.give() // also where something panics
	in = turnReader{ctx, in, &o.turn}
	switch f {
	case CSV:
		return annotateCSV(ctx, in, out, &o)
	case NDJSON:
		return annotateNDJSON(ctx, in, out, &o)
	case GeoJSON:
		return annotateGeoJSON(ctx, in, out, &o)
	case JSON:
		return annotateArray(ctx, in, out, &o)
	}
	return Stats{}, fmt.Errorf("format %q is unknown; want csv, ndjson, geojson or json", f)
}
