package annotate

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"
)

// texts are 400 rows in every format.
func texts() map[Format]string {
	var table, lines, features, array strings.Builder
	table.WriteString("lon,lat\n")
	for i := range 400 {
		lon, lat := i%360-180, i%179-89
		fmt.Fprintf(&table, "%d,%d\n", lon, lat)
		fmt.Fprintf(&lines, `{"lon":%d,"lat":%d}`+"\n", lon, lat)
		fmt.Fprintf(&features, `,{"type":"Feature","properties":{},"geometry":{"type":"Point","coordinates":[%d,%d]}}`, lon, lat)
		fmt.Fprintf(&array, `,{"lon":%d,"lat":%d}`, lon, lat)
	}
	return map[Format]string{
		CSV: table.String(), NDJSON: lines.String(),
		GeoJSON: `{"type":"FeatureCollection","features":[` + features.String()[1:] + `]}`,
		JSON:    "[" + array.String()[1:] + "]",
	}
}

var errGone = errors.New("gone")

// stuckWriter takes nothing until it is let go, and fails then.
type stuckWriter struct{ tried, free chan struct{} }

func (w *stuckWriter) Write([]byte) (int, error) {
	select {
	case w.tried <- struct{}{}:
	default:
	}
	<-w.free
	return 0, errGone
}

// TestNoTurnWhileWaiting gives runs one turn between them. One of each format waits
// for its input, then for its output; a run of another must get through meanwhile, and
// the turn be free when all have ended.
func TestNoTurnWhileWaiting(t *testing.T) {
	all := texts()
	through := func(t *testing.T, slots chan struct{}) {
		t.Helper()
		for f, text := range all {
			want, _, err := run(t, f, text, Options{})
			got, st, err2 := run(t, f, text, Options{Slots: slots})
			if err != nil || err2 != nil || got != want || st.Rows != 400 {
				t.Errorf("%s: %d rows, %v, %v; want what a run without turns gives", f, st.Rows, err, err2)
			}
		}
	}
	for f, text := range all {
		t.Run(string(f), func(t *testing.T) {
			slots := make(chan struct{}, 1)
			in, out := io.Pipe()
			ended := make(chan error, 1)
			go func() {
				_, err := Run(context.Background(), in, io.Discard, f, Options{Lookup: lookup(t, f), Slots: slots})
				ended <- err
			}()
			if _, err := io.WriteString(out, text[:len(text)/2]); err != nil {
				t.Fatal(err)
			}
			through(t, slots)
			out.CloseWithError(errGone)
			if err := <-ended; !errors.Is(err, errGone) {
				t.Errorf("the input broke off: %v", err)
			}

			w := &stuckWriter{make(chan struct{}, 1), make(chan struct{})}
			go func() {
				_, err := Run(context.Background(), bytes.NewReader([]byte(text)), w, f, Options{Lookup: lookup(t, f), Slots: slots})
				ended <- err
			}()
			<-w.tried
			through(t, slots)
			close(w.free)
			if err := <-ended; !errors.Is(err, errGone) {
				t.Errorf("the output broke: %v", err)
			}
			if len(slots) != 0 {
				t.Error("the turn is not given back")
			}
		})
	}
}
