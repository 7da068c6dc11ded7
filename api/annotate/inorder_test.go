package annotate

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"runtime"
	"strings"
	"sync/atomic"
	"testing"
)

// numbered reads chunks of one number each, the last of them last, and then gives
// the error.
func numbered(last int, err error, reads *atomic.Int64) func(c *chunk[int]) (bool, error) {
	return func(c *chunk[int]) (bool, error) {
		c.rows = int(reads.Add(1))
		c.n = 1
		if c.rows == last {
			return false, err
		}
		return true, nil
	}
}

// shuffled does work that takes differently long.
func shuffled() func(c *chunk[int]) {
	return func(c *chunk[int]) {
		for range rand.IntN(20) {
			runtime.Gosched()
		}
		c.out = fmt.Appendf(c.out, "%d,", c.rows)
		if c.rows%10 == 0 {
			c.errors = 1
		}
	}
}

func TestInOrder(t *testing.T) {
	fault := errors.New("a fault")
	var want strings.Builder
	for i := 1; i <= 3000; i++ {
		fmt.Fprintf(&want, "%d,", i)
	}
	for _, end := range []error{nil, fault} {
		var reads atomic.Int64
		var got strings.Builder
		st, err := inOrder(context.Background(), &Options{}, numbered(3000, end, &reads), shuffled, func(b []byte) error {
			got.Write(b)
			return nil
		})
		if err != end || got.String() != want.String() || st != (Stats{3000, 300}) {
			t.Errorf("error %v, %+v, %d bytes; want %v, 3000 rows in order and 300 errors", err, st, got.Len(), end)
		}
	}
}

// TestInOrderIsBounded has a writer that waits until the reader can get no
// further, as where a client does not take its answers.
func TestInOrderIsBounded(t *testing.T) {
	window := int64(2*runtime.GOMAXPROCS(0) + 1)
	var reads atomic.Int64
	written := int64(0)
	_, err := inOrder(context.Background(), &Options{}, numbered(300, nil, &reads), shuffled, func([]byte) error {
		for range 200 {
			runtime.Gosched()
		}
		if ahead := reads.Load() - written; ahead > window {
			return fmt.Errorf("%d chunks read beyond those written; the window is %d", ahead, window)
		}
		written++
		return nil
	})
	if err != nil || written != 300 {
		t.Errorf("%d chunks, %v", written, err)
	}
}

// TestInOrderStops checks that neither a writer that fails nor a context that ends
// leaves the reader running.
func TestInOrderStops(t *testing.T) {
	full := errors.New("no room")
	window := int64(2*runtime.GOMAXPROCS(0) + 1)
	var reads atomic.Int64
	st, err := inOrder(context.Background(), &Options{}, numbered(1e9, nil, &reads), shuffled, func(b []byte) error {
		if string(b) == "50," {
			return full
		}
		return nil
	})
	if !errors.Is(err, full) || st.Rows != 50 || reads.Load() > 50+2*window {
		t.Errorf("%v, %+v, %d chunks read; want the writer's error at row 50 and little more read", err, st, reads.Load())
	}
	ctx, cancel := context.WithCancel(context.Background())
	reads.Store(0)
	_, err = inOrder(ctx, &Options{}, func(c *chunk[int]) (bool, error) {
		if c.rows = int(reads.Add(1)); c.rows == 20 {
			cancel()
		}
		return true, nil
	}, shuffled, func([]byte) error { return nil })
	if !errors.Is(err, context.Canceled) || reads.Load() != 20 {
		t.Errorf("%v after %d chunks; want the context's error after 20", err, reads.Load())
	}
}
