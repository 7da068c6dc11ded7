package store

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"
)

// batch collects rows in COPY's text form.
type batch struct {
	text   []byte
	rows   int
	errors int
	values int    // of the row that is being written
	last   string // the key of the last row
}

func (b *batch) begin(key string) {
	b.last, b.values = key, 0
	b.text = appendCopyText(b.text, key)
}

func (b *batch) value(v []byte) {
	b.values++
	b.text = append(b.text, '\t')
	if len(v) == 0 {
		b.text = append(b.text, '\\', 'N')
		return
	}
	b.text = appendCopyText(b.text, v)
}

func (b *batch) end(columns int) error {
	if b.values != columns {
		return fmt.Errorf("row %q: %d values for %d columns", b.last, b.values, columns)
	}
	b.text = append(b.text, '\n')
	b.rows++
	return nil
}

func (b *batch) reset() { b.text, b.rows, b.errors = b.text[:0], 0, 0 }

// appendCopyText escapes a value for COPY's text form.
func appendCopyText[T string | []byte](b []byte, v T) []byte {
	for i := range len(v) {
		switch c := v[i]; c {
		case '\\':
			b = append(b, '\\', '\\')
		case '\t':
			b = append(b, '\\', 't')
		case '\n':
			b = append(b, '\\', 'n')
		case '\r':
			b = append(b, '\\', 'r')
		default:
			b = append(b, c)
		}
	}
	return b
}

// list joins the key and the columns, each after a prefix.
func (n *enrichNames) list(prefix string) string {
	all := append([]string{n.key}, n.columns...)
	return prefix + strings.Join(all, ", "+prefix)
}

// prepare makes the tables that are missing, takes the lock and begins a run, or goes
// on with the last one.
func (e *enrichment) prepare(ctx context.Context) error {
	n := e.names
	if err := e.lock(ctx); err != nil {
		return err
	}
	return pgx.BeginFunc(ctx, e.writer, func(tx pgx.Tx) error {
		columns := ""
		for i, c := range e.spec.Columns {
			columns += fmt.Sprintf(", %s %s", n.columns[i], c.Type)
		}
		for _, sql := range [...]string{
			fmt.Sprintf(`CREATE TABLE IF NOT EXISTS %s (%s %s PRIMARY KEY%s)`, n.target, n.key, e.source.keyType, columns),
			fmt.Sprintf(`CREATE TABLE IF NOT EXISTS %s (run_id bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY, model text NOT NULL,
				sha256 text NOT NULL, request text NOT NULL, started_at timestamptz NOT NULL DEFAULT now(), finished_at timestamptz,
				last_key %s, "rows" bigint NOT NULL DEFAULT 0, errors bigint NOT NULL DEFAULT 0, changed bigint NOT NULL DEFAULT 0)`, n.runs, e.source.keyType),
			fmt.Sprintf(`CREATE TABLE IF NOT EXISTS %s (run_id bigint NOT NULL REFERENCES %s ON DELETE CASCADE, key %s,
				was text, became text, PRIMARY KEY (run_id, key))`, n.changes, n.runs, e.source.keyType),
		} {
			if _, err := tx.Exec(ctx, sql); err != nil {
				return err
			}
		}
		if err := checkTarget(ctx, tx, e.spec, n); err != nil {
			return err
		}
		if err := e.resume(ctx, tx); err != nil {
			return err
		}
		stage := fmt.Sprintf(`CREATE TEMP TABLE nearmargin_batch ON COMMIT DELETE ROWS AS SELECT %s FROM %s WITH NO DATA`, n.list(""), n.target)
		_, err := tx.Exec(ctx, stage)
		return err
	})
}

// lockPatience is how long to wait for the lock: the server may take a moment to see
// that the run before was killed.
const lockPatience = 3 * time.Second

// lock takes the target's lock, which the session holds to its end.
func (e *enrichment) lock(ctx context.Context) error {
	const try = `SELECT pg_try_advisory_lock(hashtextextended('nearmargin into ' || $1, 0))`
	for end := time.Now().Add(lockPatience); ; {
		var alone bool
		if err := e.writer.QueryRow(ctx, try, e.names.target).Scan(&alone); alone || err != nil {
			return err
		}
		if time.Now().After(end) {
			return &Error{Op: "annotate into", Ref: e.spec.Target, Kind: ErrEnrichRunning}
		}
		if err := sleep(ctx, lockPatience/20); err != nil {
			return err
		}
	}
}

// checkTarget refuses a table that is not one of answers by this key.
func checkTarget(ctx context.Context, tx pgx.Tx, spec *EnrichSpec, n *enrichNames) error {
	have, err := columnsOf(ctx, tx, n.target)
	if err != nil {
		return err
	}
	for _, c := range spec.Columns {
		if have[c.Name].typ == "" {
			return enrichFault(spec.Target, "the table is there and has no column %q, so it holds no answers of this kind; name another with --into, or drop it", c.Name)
		}
	}
	if !have[spec.Key].unique {
		return enrichFault(spec.Target, "the table is there and its column %q is not its primary key; name another with --into, or drop it", spec.Key)
	}
	return nil
}

// request tells runs that do the same from others.
func (e *enrichment) request() string {
	parts := append([]string{e.names.source, e.spec.Key, e.spec.Geometry}, e.spec.Extra...)
	return strings.Join(append(parts, e.spec.Where, e.spec.Options), "\x1f")
}

// resume goes on with the last run where that was cut off and did the same.
func (e *enrichment) resume(ctx context.Context, tx pgx.Tx) error {
	n, r := e.names, e.report
	var any bool
	if err := tx.QueryRow(ctx, fmt.Sprintf(`SELECT EXISTS (SELECT FROM %s)`, n.target)).Scan(&any); err != nil {
		return err
	}
	e.fresh = !any
	err := tx.QueryRow(ctx, fmt.Sprintf(`
SELECT run_id, last_key::text, "rows", errors, changed FROM (SELECT * FROM %s ORDER BY run_id DESC LIMIT 1) r
WHERE finished_at IS NULL AND model = @model AND sha256 = @sha256 AND request = @request`, n.runs),
		pgx.StrictNamedArgs{"model": e.spec.Ref, "sha256": e.spec.SHA256, "request": e.request()}).
		Scan(&r.Run, &e.after, &r.Rows, &r.Errors, &r.Changed)
	if err == nil {
		r.Resumed = true
		return nil
	}
	if !errors.Is(err, pgx.ErrNoRows) {
		return err
	}
	return tx.QueryRow(ctx, fmt.Sprintf(`INSERT INTO %s (model, sha256, request) VALUES (@model, @sha256, @request) RETURNING run_id`, n.runs),
		pgx.StrictNamedArgs{"model": e.spec.Ref, "sha256": e.spec.SHA256, "request": e.request()}).Scan(&r.Run)
}

// write puts a batch into the target, all of it and the last key or nothing.
func (e *enrichment) write(ctx context.Context, b *batch) error {
	n, r := e.names, *e.report
	err := pgx.BeginFunc(ctx, e.writer, func(tx pgx.Tx) error {
		into := fmt.Sprintf(`COPY pg_temp.nearmargin_batch (%s) FROM STDIN`, n.list(""))
		if _, err := tx.Conn().PgConn().CopyFrom(ctx, bytes.NewReader(b.text), into); err != nil {
			return err
		}
		if !e.fresh {
			tag, err := tx.Exec(ctx, fmt.Sprintf(`
INSERT INTO %s (run_id, key, was, became)
SELECT @run, s.%[2]s, t.%[3]s, s.%[3]s FROM pg_temp.nearmargin_batch s JOIN %[4]s t ON t.%[2]s = s.%[2]s
WHERE t.%[3]s IS DISTINCT FROM s.%[3]s`, n.changes, n.key, n.label, n.target), pgx.StrictNamedArgs{"run": r.Run})
			if err != nil {
				return err
			}
			r.Changed += tag.RowsAffected()
		}
		set := make([]string, len(n.columns))
		for i, c := range n.columns {
			set[i] = c + " = EXCLUDED." + c
		}
		tag, err := tx.Exec(ctx, fmt.Sprintf(`INSERT INTO %s (%s) SELECT %s FROM pg_temp.nearmargin_batch s ON CONFLICT (%s) DO UPDATE SET %s`,
			n.target, n.list(""), n.list("s."), n.key, strings.Join(set, ", ")))
		if err != nil {
			return err
		}
		if tag.RowsAffected() != int64(b.rows) {
			return fmt.Errorf("%d rows were written for %d keys", tag.RowsAffected(), b.rows)
		}
		r.Rows, r.Errors = r.Rows+int64(b.rows), r.Errors+int64(b.errors)
		_, err = tx.Exec(ctx, fmt.Sprintf(`UPDATE %s SET last_key = @last::text::%s, "rows" = @rows, errors = @errors, changed = @changed WHERE run_id = @run`,
			n.runs, e.source.keyType), pgx.StrictNamedArgs{"last": b.last, "rows": r.Rows, "errors": r.Errors, "changed": r.Changed, "run": r.Run})
		return err
	})
	if err != nil {
		return err
	}
	b.reset()
	*e.report = r
	if e.spec.Progress != nil {
		e.spec.Progress(r)
	}
	return nil
}

// finish closes the run, and counts what it left as it was.
func (e *enrichment) finish(ctx context.Context) error {
	n, r := e.names, e.report
	if _, err := e.writer.Exec(ctx, fmt.Sprintf(`UPDATE %s SET finished_at = now() WHERE run_id = @run`, n.runs), pgx.StrictNamedArgs{"run": r.Run}); err != nil {
		return err
	}
	var all int64
	if err := e.writer.QueryRow(ctx, fmt.Sprintf(`SELECT count(*) FROM %s`, n.target)).Scan(&all); err != nil {
		return err
	}
	r.Untouched = max(0, all-r.Rows)
	return nil
}

// WriteChanges writes the rows whose label a run changed as CSV: key, was, became.
func WriteChanges(ctx context.Context, url string, spec EnrichSpec, run int64, out io.Writer) error {
	n, err := namesOf(&spec)
	if err != nil {
		return err
	}
	conn, err := openSession(ctx, url)
	if err != nil {
		return err
	}
	defer conn.Close(context.WithoutCancel(ctx))
	sql := fmt.Sprintf(`COPY (SELECT key AS %s, was, became FROM %s WHERE run_id = %d ORDER BY nearmargin_changes.key) TO STDOUT (FORMAT csv, HEADER)`,
		n.key, n.changes+" AS nearmargin_changes", run)
	_, err = conn.PgConn().CopyTo(ctx, out, sql)
	return enrichError(spec.Target, err)
}
