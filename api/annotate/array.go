package annotate

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
)

// annotateArray answers for a short JSON array of objects, as apps send it.
func annotateArray(ctx context.Context, in io.Reader, out io.Writer, o *Options) (Stats, error) {
	var st Stats
	body, err := io.ReadAll(io.LimitReader(in, o.ArrayBytes+1))
	if err != nil {
		return st, err
	}
	if int64(len(body)) > o.ArrayBytes {
		return st, &InputError{Line: 1, TooLarge: true, Detail: fmt.Sprintf("the array is longer than %d bytes; send NDJSON or CSV", o.ArrayBytes)}
	}
	var items []json.RawMessage
	if err := json.Unmarshal(body, &items); err != nil || items == nil {
		if fault := jsonFault(body); fault != nil {
			return st, &InputError{Line: 1, Detail: fault.Error()}
		}
		return st, &InputError{Line: 1, Detail: `the body must be a JSON array of objects with lon and lat, such as [{"lon":-72.4,"lat":-36.1}]`}
	}
	if len(items) > MaxArray {
		return st, &InputError{Pointer: fmt.Sprintf("/%d", MaxArray), Detail: fmt.Sprintf("the array has %d elements and %d are the limit; send NDJSON or CSV", len(items), MaxArray)}
	}
	k := &asker{ctx: ctx, o: o}
	b := []byte{'['}
	for i, raw := range items {
		if raw[0] != '{' {
			return st, &InputError{Pointer: fmt.Sprintf("/%d", i), Detail: "an element must be an object with lon and lat"}
		}
		if i > 0 {
			b = append(b, ',', '\n')
		}
		var ok bool
		if b, ok, err = k.inTurn((*asker).object, b, raw); err != nil {
			return st, err
		}
		st.Rows++
		if !ok {
			st.Errors++
		}
	}
	b = append(b, ']', '\n')
	_, err = out.Write(b)
	return st, err
}
