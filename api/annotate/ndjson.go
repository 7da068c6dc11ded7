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
	var st Stats
	k := &asker{o: o}
	w := bufio.NewWriterSize(out, 64<<10)
	sc := bufio.NewScanner(in)
	sc.Buffer(make([]byte, 0, min(64<<10, o.RowBytes)), o.RowBytes)
	var buf []byte
	line := 0
	for sc.Scan() {
		if line%256 == 0 {
			if err := ctx.Err(); err != nil {
				return st, err
			}
			if o.Progress != nil {
				o.Progress(st)
			}
		}
		line++
		raw := sc.Bytes()
		if line == 1 {
			raw = bytes.TrimPrefix(raw, byteOrderMark)
		}
		raw = bytes.TrimSpace(raw)
		buf = buf[:0]
		if len(raw) > 0 {
			st.Rows++
			var ok bool
			if buf, ok = k.line(buf, raw, line); !ok {
				st.Errors++
			}
		}
		buf = append(buf, '\n')
		if _, err := w.Write(buf); err != nil {
			return st, err
		}
	}
	if err := sc.Err(); errors.Is(err, bufio.ErrTooLong) {
		return st, badLine(line+1, "the line is longer than %d bytes", o.RowBytes)
	} else if err != nil {
		return st, err
	}
	if o.Progress != nil {
		o.Progress(st)
	}
	return st, w.Flush()
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
