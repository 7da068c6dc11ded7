package annotate

import "context"

// take waits for a place among those that work at once; give gives it back. The
// error is the context's, where that ends first.
func (o *Options) take(ctx context.Context) error {
	if o.Slots == nil {
		return ctx.Err()
	}
	select {
	case o.Slots <- struct{}{}:
	case <-ctx.Done():
		return ctx.Err()
	}
	if err := ctx.Err(); err != nil { // both were ready
		o.give()
		return err
	}
	return nil
}

func (o *Options) give() {
	if o.Slots != nil {
		<-o.Slots
	}
}

// inTurn has one object worked on when its turn comes. The error is the context's:
// what was appended is then not to be used.
func (k *asker) inTurn(do func(k *asker, b, raw []byte) ([]byte, bool), b, raw []byte) (_ []byte, ok bool, err error) {
	if err := k.o.take(k.ctx); err != nil {
		return b, false, err
	}
	defer k.o.give()
	b, ok = do(k, b, raw)
	return b, ok, k.ctx.Err()
}
