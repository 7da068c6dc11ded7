package annotate

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"

	"nearmargin/api/wire"
)

// features is one pass over a FeatureCollection or a Feature.
type features struct {
	asker
	d    *json.Decoder
	g    *guard
	out  *bufio.Writer
	st   Stats
	kind string // the type member, once seen
	buf  []byte // members that stand before the features
}

// annotateGeoJSON copies a FeatureCollection, feature by feature, and adds the
// answer to the properties of each. A single Feature is taken as well.
func annotateGeoJSON(ctx context.Context, in io.Reader, out io.Writer, o *Options) (Stats, error) {
	g := &guard{r: in, limit: int64(o.RowBytes)}
	f := &features{asker: asker{ctx: ctx, o: o}, g: g, d: json.NewDecoder(g), out: bufio.NewWriterSize(out, 64<<10)}
	f.d.UseNumber() // a number beyond float64 is still a number
	if err := f.run(); err != nil {
		return f.st, f.fault(err)
	}
	if o.Progress != nil {
		o.Progress(f.st)
	}
	return f.st, f.out.Flush()
}

func (f *features) run() error {
	tok, err := f.d.Token()
	if err != nil {
		return err
	}
	if tok != json.Delim('{') {
		return &InputError{Pointer: "", Line: 1, Detail: "the input is not a JSON object; want a FeatureCollection or a Feature"}
	}
	streaming := false
	for f.d.More() {
		tok, err := f.d.Token()
		if err != nil {
			return err
		}
		key, _ := tok.(string) // the name of a member is always a string
		f.buf = wire.AppendString(f.buf, key)
		f.buf = append(f.buf, ':')
		if key == "features" {
			if streaming {
				return &InputError{Pointer: "/features", Detail: "features stands twice"}
			}
			streaming = true
			if err := f.write('{', f.buf, '['); err != nil {
				return err
			}
			if err := f.stream(); err != nil {
				return err
			}
			f.buf = append(f.buf[:0], ']')
		} else if err := f.member(key); err != nil {
			return err
		}
		if streaming {
			if err := f.write(0, f.buf, 0); err != nil {
				return err
			}
			f.buf = f.buf[:0]
		}
		f.buf = append(f.buf, ',')
		f.g.mark(f.d.InputOffset())
	}
	if _, err := f.d.Token(); err != nil {
		return err
	}
	if _, err := f.d.Token(); err != io.EOF {
		return &InputError{Line: 1, Detail: fmt.Sprintf("something follows the JSON object, at byte %d", f.d.InputOffset())}
	}
	return f.finish(streaming)
}

// member copies a member other than the features.
func (f *features) member(key string) error {
	var raw json.RawMessage
	if err := f.d.Decode(&raw); err != nil {
		return err
	}
	if key == "type" {
		if err := json.Unmarshal(raw, &f.kind); err != nil {
			return &InputError{Pointer: "/type", Detail: `type must be "FeatureCollection" or "Feature"`}
		}
	}
	f.buf = append(f.buf, raw...)
	if len(f.buf) > f.o.RowBytes {
		return errRowTooLong
	}
	return nil
}

// stream copies the features.
func (f *features) stream() error {
	tok, err := f.d.Token()
	if err != nil {
		return err
	}
	if tok != json.Delim('[') {
		return &InputError{Pointer: "/features", Detail: "features must be an array"}
	}
	for f.d.More() {
		if f.st.Rows%256 == 0 && f.o.Progress != nil {
			f.o.Progress(f.st)
		}
		f.g.mark(f.d.InputOffset())
		var raw json.RawMessage
		if err := f.d.Decode(&raw); err != nil {
			return err
		}
		if len(raw) > f.o.RowBytes { // the guard alone is as coarse as the reads are
			return errRowTooLong
		}
		f.buf = f.buf[:0]
		if f.st.Rows > 0 {
			f.buf = append(f.buf, ',')
		}
		f.buf = append(f.buf, '\n')
		f.st.Rows++
		if raw[0] != '{' {
			return &InputError{Pointer: fmt.Sprintf("/features/%d", f.st.Rows-1), Detail: "a feature must be a JSON object"}
		}
		var ok bool
		if f.buf, ok, err = f.inTurn((*asker).feature, f.buf, raw); err != nil {
			f.st.Rows-- // it has no answer
			return err
		}
		if !ok {
			f.st.Errors++
		}
		if err := f.write(0, f.buf, 0); err != nil {
			return err
		}
	}
	_, err = f.d.Token() // the closing bracket
	return err
}

// finish closes a collection, or answers for a single feature.
func (f *features) finish(streaming bool) error {
	if streaming {
		if f.kind != "FeatureCollection" {
			return &InputError{Pointer: "/type", Detail: fmt.Sprintf(`type is %q; an object with features must be a "FeatureCollection"`, f.kind)}
		}
		return f.write(0, nil, '}')
	}
	if f.kind != "Feature" {
		return &InputError{Pointer: "/type", Detail: fmt.Sprintf(`type is %q; want a "FeatureCollection" with features, or a "Feature" of a Point`, f.kind)}
	}
	raw := append([]byte{'{'}, f.buf...)
	raw[len(raw)-1] = '}' // in place of the last comma
	var ok bool
	var err error
	if f.buf, ok, err = f.inTurn((*asker).feature, nil, raw); err != nil {
		return err
	}
	f.st.Rows = 1
	if !ok {
		f.st.Errors = 1
	}
	return f.write(0, f.buf, '\n')
}

// write writes a byte, unless it is 0, some bytes, and another byte.
func (f *features) write(before byte, b []byte, after byte) error {
	if before != 0 {
		if err := f.out.WriteByte(before); err != nil {
			return err
		}
	}
	if _, err := f.out.Write(b); err != nil {
		return err
	}
	if after != 0 {
		return f.out.WriteByte(after)
	}
	return nil
}

// fault puts what the decoder reports into a fault of the input.
func (f *features) fault(err error) error {
	var syntax *json.SyntaxError
	var input *InputError
	switch {
	case errors.As(err, &input):
		return err
	case errors.Is(err, errRowTooLong):
		return &InputError{Pointer: fmt.Sprintf("/features/%d", f.st.Rows), Detail: fmt.Sprintf("a feature or member is longer than %d bytes", f.o.RowBytes)}
	case errors.As(err, &syntax):
		return &InputError{Line: 1, Detail: fmt.Sprintf("not JSON: %v, at byte %d", syntax, syntax.Offset)}
	case err == io.EOF || errors.Is(err, io.ErrUnexpectedEOF):
		return &InputError{Line: 1, Detail: fmt.Sprintf("the JSON text ends too early, at byte %d", f.g.read)}
	}
	return err
}
