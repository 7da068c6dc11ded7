package annotate

import (
	"context"
	"io"
)

// turn is a goroutine's share in Options.Slots. It holds a place while it computes and
// gives it back while it waits for its input. Where there are no slots it does nothing.
// One goroutine alone uses it.
type turn struct {
	slots chan struct{}
	held  bool
}

// take waits for a place. The error is the context's, where that ends first.
func (t *turn) take(ctx context.Context) error {
	if t.slots != nil {
		select {
		case t.slots <- struct{}{}:
			t.held = true
		case <-ctx.Done():
		}
	}
	err := ctx.Err() // also where both were ready
	if err != nil {
		t.give()
	}
	return err
}

func (t *turn) give() {
	if t.held {
		t.held = false
		<-t.slots
	}
}

// turnReader holds no place while it waits.
type turnReader struct {
	ctx context.Context
	r   io.Reader
	t   *turn
}

func (r turnReader) Read(p []byte) (int, error) {
	if !r.t.held {
		return r.r.Read(p)
	}
	r.t.give()
	n, err := r.r.Read(p)
	if ended := r.t.take(r.ctx); ended != nil && err == nil {
		err = ended
	}
	return n, err
}

// inTurn has one object worked on when its turn comes. The error is the context's:
// what was appended is then not to be used.
func (k *asker) inTurn(do func(k *asker, b, raw []byte) ([]byte, bool), b, raw []byte) (_ []byte, ok bool, err error) {
	t := turn{slots: k.o.Slots}
	if err := t.take(k.ctx); err != nil {
		return b, false, err
	}
	defer t.give()
	b, ok = do(k, b, raw)
	return b, ok, k.ctx.Err()
}
