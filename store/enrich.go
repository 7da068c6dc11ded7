package store

import (
	"context"
	"errors"
	"fmt"

	"github.com/jackc/pgx/v5"
)

// EnrichColumn is a column that a table of answers has, besides the key.
type EnrichColumn struct{ Name, Type string }

// EnrichSpec says what to read, what to ask, and where to write. Tables are named
// "table" or "schema.table"; names are taken as they stand, and may be put in double
// quotes where they hold a dot.
type EnrichSpec struct {
	Source, Key, Geometry string
	Extra                 []string // further columns to read, as text
	// Where is an SQL condition on the source's columns, "" for all rows. It is the
	// operator's own SQL and goes to the server as it is.
	Where  string
	Target string

	Columns []EnrichColumn
	Label   string // the one of Columns whose changes are kept
	// Ref and SHA256 name what answers, and Options how it was asked; a run that was
	// cut off is only gone on with where these and what is read are the same.
	Ref, SHA256, Options string

	MaxPositions int                   // of a geometry; one with more is a row's fault. 0: no limit
	BatchRows    int                   // rows of one transaction; 0 means DefaultBatchRows
	Progress     func(EnrichReport)    // called after each transaction; may be nil
	Answer       func(EnrichAsk) error // answers for one row; an error ends the run
}

// The bounds of one transaction.
const (
	DefaultBatchRows = 5000
	maxBatchBytes    = 8 << 20
)

// EnrichAsk is one row to be answered for. What it holds is valid during the call.
type EnrichAsk struct {
	Row *EnrichRow
	put *batch
}

// EnrichRow is a row as it was read.
type EnrichRow struct {
	Key   string
	WKB   []byte // the geometry in WGS84, two-dimensional well-known binary; nil where Fault says why
	Fault string
	Extra []string // "" stands for NULL too
}

// Put adds the value of the next column; an empty one is NULL.
func (a EnrichAsk) Put(value []byte) { a.put.value(value) }

// Fail counts the row among those that carry an error.
func (a EnrichAsk) Fail() { a.put.errors++ }

// EnrichReport is how far a run has come.
type EnrichReport struct {
	Run       int64 // its number in the table of runs
	Resumed   bool  // it goes on with one that was cut off
	Total     int64 // rows to be done in all, when this run began or went on
	Rows      int64 // done, before it was cut off too
	Errors    int64 // of them, those that carry an error
	Changed   int64 // of them, those that had another label before
	Untouched int64 // rows of the target that no longer have a row in what was read; set at the end
}

// ErrEnrichRunning says that another run writes the same target.
var ErrEnrichRunning = errors.New("another run writes this table; try again when it has ended")

// Enrich reads the source in the order of its key and writes an answer for every row
// into the target, which it makes where there is none. Rows that the target has
// already are written anew.
//
// What is read is one snapshot. Rows are written in transactions of up to BatchRows,
// each with the last key done, so that a run that was cut off goes on there (with a
// snapshot of its own) and no row is ever there twice. Beside the target stand two
// tables: target_runs, a line a run, and target_changes, the rows whose label a run
// changed.
//
// Memory does not grow with the number of rows.
func Enrich(ctx context.Context, url string, spec EnrichSpec) (EnrichReport, error) {
	var report EnrichReport
	n, err := namesOf(&spec)
	if err != nil {
		return report, err
	}
	w, err := openSession(ctx, url)
	if err != nil {
		return report, err
	}
	defer w.Close(context.WithoutCancel(ctx))
	r, err := openSession(ctx, url)
	if err != nil {
		return report, err
	}
	defer r.Close(context.WithoutCancel(ctx))
	e := &enrichment{spec: &spec, names: n, writer: w, reader: r, report: &report}
	return report, enrichError(spec.Source, e.run(ctx))
}

// enrichment is one run.
type enrichment struct {
	spec           *EnrichSpec
	names          *enrichNames
	reader, writer *pgx.Conn
	report         *EnrichReport
	source         *sourceTable
	after          *string // the last key done, nil before the first
	fresh          bool    // the target held nothing when the run began
}

func (e *enrichment) run(ctx context.Context) error {
	if _, err := e.reader.Exec(ctx, makeWGS84SQL); err != nil {
		return err
	}
	tx, err := e.reader.BeginTx(ctx, pgx.TxOptions{IsoLevel: pgx.RepeatableRead, AccessMode: pgx.ReadOnly})
	if err != nil {
		return err
	}
	defer tx.Rollback(context.WithoutCancel(ctx)) // it only reads
	if e.source, err = inspectSource(ctx, tx, e.spec, e.names); err != nil {
		return err
	}
	if err := e.source.check(e.spec); err != nil {
		return err
	}
	e.report.Total = e.source.rows
	if err := e.prepare(ctx); err != nil {
		return err
	}
	if err := e.copy(ctx); err != nil {
		return err
	}
	return e.finish(ctx)
}

// copy reads, asks and writes.
func (e *enrichment) copy(ctx context.Context) error {
	sql := e.names.readSQL(e.spec, e.source.keyType, e.after)
	most := e.spec.BatchRows
	if most == 0 {
		most = DefaultBatchRows
	}
	b := &batch{}
	rows := startCopy(ctx, e.reader.PgConn(), sql, len(e.spec.Extra))
	defer rows.stop()
	for {
		row, err := rows.next()
		if err != nil {
			return err
		}
		if row == nil {
			break
		}
		b.begin(row.Key)
		if err := e.spec.Answer(EnrichAsk{row, b}); err != nil {
			return err
		}
		if err := b.end(len(e.spec.Columns)); err != nil {
			return err
		}
		if b.rows >= most || len(b.text) >= maxBatchBytes {
			if err := e.write(ctx, b); err != nil {
				return err
			}
		}
	}
	if b.rows == 0 {
		return nil
	}
	return e.write(ctx, b)
}

// enrichError keeps the server's own words: its faults are of the operator's tables,
// not of the schema that this package knows.
func enrichError(source string, err error) error {
	if err == nil {
		return nil
	}
	if have := (*Error)(nil); errors.As(err, &have) {
		return err
	}
	e := interpretError("annotate", source, err).(*Error)
	if e.Kind != ErrUnavailable {
		e.Kind, e.Err = nil, err
	}
	return e
}

func enrichFault(source, format string, args ...any) error {
	return &Error{Op: "annotate", Ref: source, Err: fmt.Errorf(format, args...)}
}
