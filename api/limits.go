package api

import (
	"cmp"
	"errors"
	"fmt"
	"time"

	"nearmargin/api/annotate"
)

// Limits bound what one request and all batches together may take. A zero field
// stands for the value in DefaultLimits.
type Limits struct {
	BodyBytes int64         // of a body that is not streamed: an area, a JSON array
	RowBytes  int           // of one row, line or feature of a batch
	Batches   int           // at once
	Areas     int           // worked on or waiting for their turn
	BatchTime time.Duration // of one batch, from its header to its end
	// StallTime is how long a batch may wait for its client in either direction
	// before it gets on: by progressBytes of its body, or by one write of the answer.
	StallTime time.Duration
	// HeaderBytes and ReadTime are the http.Server's to keep; here they are told to
	// who goes beyond. ReadTime is that of a whole request other than a batch.
	HeaderBytes int
	ReadTime    time.Duration
}

// DefaultLimits are the limits used where none are given.
var DefaultLimits = Limits{
	BodyBytes: annotate.MaxArrayBytes,
	RowBytes:  annotate.MaxRowBytes,
	Batches:   16,
	Areas:     16,
	BatchTime: 6 * time.Hour,
	StallTime: 30 * time.Second,

	HeaderBytes: 64 << 10,
	ReadTime:    time.Minute,
}

// progressBytes of a body within StallTime count as progress. A client that
// sends more slowly is cut off.
const progressBytes = 1 << 10

// Validate reports every limit that is out of range.
func (l Limits) Validate() error {
	var errs []error
	within := func(name string, x, low, high int64, unit string) {
		if x < low || x > high {
			errs = append(errs, fmt.Errorf("%s is %d%s; want %d to %d", name, x, unit, low, high))
		}
	}
	within("max-body-bytes", l.BodyBytes, 1<<10, 256<<20, " bytes")
	within("max-row-bytes", int64(l.RowBytes), 1<<10, 64<<20, " bytes")
	within("max-header-bytes", int64(l.HeaderBytes), 4<<10, 1<<20, " bytes")
	within("read-timeout", int64(l.ReadTime/time.Second), 1, 3600, " s")
	within("max-batches", int64(l.Batches), 1, 1000, "")
	within("max-areas", int64(l.Areas), 1, 1000, "")
	within("batch-timeout", int64(l.BatchTime/time.Second), 1, 7*24*3600, " s")
	within("stall-timeout", int64(l.StallTime/time.Second), 1, 3600, " s")
	return errors.Join(errs...)
}

// fill puts the defaults in place of zeros.
func (l *Limits) fill() {
	d := DefaultLimits
	*l = Limits{
		BodyBytes: cmp.Or(l.BodyBytes, d.BodyBytes), RowBytes: cmp.Or(l.RowBytes, d.RowBytes),
		Batches: cmp.Or(l.Batches, d.Batches), Areas: cmp.Or(l.Areas, d.Areas),
		BatchTime: cmp.Or(l.BatchTime, d.BatchTime), StallTime: cmp.Or(l.StallTime, d.StallTime),
		HeaderBytes: cmp.Or(l.HeaderBytes, d.HeaderBytes), ReadTime: cmp.Or(l.ReadTime, d.ReadTime),
	}
}
