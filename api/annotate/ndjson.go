package annotate

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"

	"nearmargin/api/wire"
)

// annotateNDJSON copies lines of JSON objects and adds a member to each. A line
// that is no object becomes one that holds its text and what is wrong.
func annotateNDJSON(ctx context.Context, in io.Reader, out io.Writer, o *Options) (Stats, error) {
	w := bufio.NewWriterSize(out, 64<<10)
	sc := bufio.NewScanner(in)
	sc.Buffer(make([]byte, 0, min(64<<10, o.RowBytes)), o.RowBytes)
	line := 0
	read := func(c *chunk[lines]) (more bool, err error) {
		r := &c.rows
		r.text, r.ends, r.before = r.text[:0], r.ends[:0], line
		for len(r.ends) < chunkRows && len(r.text) < chunkBytes {
			if !sc.Scan() {
				if err := sc.Err(); errors.Is(err, bufio.ErrTooLong) {
					return false, badLine(line+1, "the line is longer than %d bytes", o.RowBytes)
				} else if err != nil {
					return false, err
				}
				return false, nil
			}
			line++
			raw := sc.Bytes()
			if line == 1 {
				raw = bytes.TrimPrefix(raw, byteOrderMark)
			}
			if raw = bytes.TrimSpace(raw); len(raw) > 0 {
				c.n++
			}
			r.text = append(r.text, raw...)
			r.ends = append(r.ends, len(r.text))
		}
		return true, nil
	}
	newWorker := func() func(*chunk[lines]) {
		k := &asker{ctx: ctx, o: o}
		return func(c *chunk[lines]) {
			from := 0
			for i, to := range c.rows.ends {
				if ctx.Err() != nil { // a line may be an area, which takes time
					return
				}
				if from < to {
					var ok bool
					if c.out, ok = k.line(c.out, c.rows.text[from:to], c.rows.before+i+1); !ok {
						c.errors++
					}
				}
				c.out = append(c.out, '\n')
				from = to
			}
		}
	}
	st, err := inOrder(ctx, o, read, newWorker, func(b []byte) error {
		_, err := w.Write(b)
		return err
	})
	if err != nil {
		return st, err
	}
	return st, w.Flush()
}

// lines are the lines of a chunk, end to end.
type lines struct {
	text   []byte
	ends   []int
	before int // lines before the first
}

// line appends one line's object with its answer.
func (k *asker) line(b, raw []byte, line int) ([]byte, bool) {
	if json.Valid(raw) && raw[0] == '{' {
		return k.object(b, raw)
	}
	err := jsonFault(raw)
	if err == nil {
		err = errors.New("not a JSON object")
	}
	b = append(b, `{"`+memberError+`":`...)
	b = wire.AppendString(b, fmt.Sprintf("line %d: %v", line, err))
	b = append(b, `,"line_text":`...)
	b = wire.AppendString(b, string(raw))
	return append(b, '}'), false
}
