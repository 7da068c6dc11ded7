package annotate

import (
	"fmt"
	"regexp"

	"nearmargin/setting"
)

// Format is a form of the input, and of the output.
type Format string

// The formats.
const (
	CSV     Format = "csv"
	NDJSON  Format = "ndjson"
	GeoJSON Format = "geojson"
	JSON    Format = "json" // an array of at most MaxArray objects
)

// The limits of one row, feature or array.
const (
	MaxRowBytes   = 1 << 20
	MaxArray      = 1000
	MaxArrayBytes = 4 << 20
	MaxColumns    = 4096 // of a table: short rows are filled up to its width
)

// Options say where the coordinates are and what to add.
type Options struct {
	Lookup *setting.Lookup // made with Brief for CSV, in full for the rest
	// LonColumn, LatColumn, DepthColumn and UncertaintyColumn name columns or
	// members; "" finds longitude and latitude by name, and takes no depth or
	// uncertainty. DepthColumn ThirdCoordinate takes a feature's third coordinate.
	LonColumn, LatColumn, DepthColumn, UncertaintyColumn string
	Prefix                                               string // of added CSV columns; "" means DefaultPrefix
	// DepthUnit is that of the depths and elevations: UnitKm (also ""), UnitM or
	// UnitFt. DepthDatum is what depths are counted from: SeaLevel (also "") or
	// Ground, with which ElevationColumn names the ground's height above sea level.
	DepthUnit, DepthDatum, ElevationColumn string
	Progress                               func(Stats) // called now and then; may be nil
	// Slots bounds how many goroutines read rows and work on them at once, of all runs
	// that share it: a place in it is taken for each chunk, and given back while the
	// input is waited for. No bound where nil.
	Slots      chan struct{}
	RowBytes   int   // most bytes of a row, line or feature; MaxRowBytes where 0
	ArrayBytes int64 // most bytes of a JSON array; MaxArrayBytes where 0

	turn turn // of the goroutine that reads
}

// DefaultPrefix stands before the names of added CSV columns.
const DefaultPrefix = "ts_"

// ThirdCoordinate as DepthColumn means the third coordinate of a point, in
// DepthUnit, positive down.
const ThirdCoordinate = "@z"

var prefixForm = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9_.-]{0,31}$`)

func (o *Options) fill() error {
	if o.Prefix == "" {
		o.Prefix = DefaultPrefix
	}
	if !prefixForm.MatchString(o.Prefix) {
		return &InputError{Parameter: "prefix", Detail: fmt.Sprintf("%q must be a letter and at most 31 letters, digits, '_', '.' or '-'", o.Prefix)}
	}
	if o.RowBytes == 0 {
		o.RowBytes = MaxRowBytes
	}
	if o.ArrayBytes == 0 {
		o.ArrayBytes = MaxArrayBytes
	}
	return o.fillDepth()
}

// Stats counts what was done.
type Stats struct {
	Rows   int64 // rows or features seen
	Errors int64 // of them, those that carry an error
}

// InputError is a fault of the whole input, not of one row.
type InputError struct {
	Parameter string // of the request, "" where the fault is in the data
	Pointer   string // JSON pointer, "" where it has none
	Line      int    // from 1, 0 where it has none
	Detail    string // what was wrong and what would be right
	TooLarge  bool   // the input is longer than its form may be
}

func (e *InputError) Error() string {
	switch {
	case e.Parameter != "":
		return e.Parameter + ": " + e.Detail
	case e.Line > 0:
		return fmt.Sprintf("line %d: %s", e.Line, e.Detail)
	case e.Pointer != "":
		return e.Pointer + ": " + e.Detail
	}
	return e.Detail
}

func badLine(line int, format string, args ...any) error {
	return &InputError{Line: line, Detail: fmt.Sprintf(format, args...)}
}
