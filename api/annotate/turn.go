package annotate

import "io"

// turn is a goroutine's share in Options.Slots. It holds a place while it computes and
// gives it back while it waits for its input or its output. Where there are no slots
// it does nothing. One goroutine alone uses it.
type turn struct {
	slots chan struct{}
	held  bool
}

func (t *turn) take() {
	if t.slots != nil {
		t.slots <- struct{}{}
		t.held = true
	}
}

func (t *turn) give() {
	if t.held {
		t.held = false
		<-t.slots
	}
}

// next lets others go first, where any wait.
func (t *turn) next() {
	if t.held {
		t.give()
		t.take()
	}
}

// rest gives the place back while f waits.
func (t *turn) rest(f func() (int, error)) (int, error) {
	if t.held {
		t.give()
		defer t.take()
	}
	return f()
}

// turnReader and turnWriter hold no place while they wait.
type turnReader struct {
	r io.Reader
	t *turn
}

func (r turnReader) Read(p []byte) (int, error) {
	return r.t.rest(func() (int, error) { return r.r.Read(p) })
}

type turnWriter struct {
	w io.Writer
	t *turn
}

func (w turnWriter) Write(p []byte) (int, error) {
	return w.t.rest(func() (int, error) { return w.w.Write(p) })
}
