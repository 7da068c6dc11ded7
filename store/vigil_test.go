package store

import (
	"context"
	"errors"
	"testing"
	"testing/synctest"
	"time"
)

// TestVigil: given a transfer that takes longer than a silence may, expect it to go on
// as long as something comes, and to end as unavailable when nothing does.
func TestVigil(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		const limit = 15 * time.Second
		ctx, v := keepVigil(t.Context(), limit)
		for range 10 {
			time.Sleep(limit - time.Second)
			v.heard()
		}
		if ctx.Err() != nil {
			t.Fatalf("it ended while something came: %v", context.Cause(ctx))
		}
		began := time.Now()
		<-ctx.Done()
		if silent := time.Since(began); silent != limit {
			t.Errorf("it ended after %v of silence, want %v", silent, limit)
		}
		if err := v.end(ctx.Err()); !errors.Is(err, ErrUnavailable) {
			t.Errorf("%v, want that the database does not answer", err)
		}
	})
	ctx, v := keepVigil(t.Context(), time.Hour)
	if err := v.end(nil); err != nil || ctx.Err() == nil {
		t.Errorf("a vigil that was ended in time: %v, context %v", err, ctx.Err())
	}
}
