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
	"time"
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

// TestInOrderLeavesOff: once the context ends, what waits for a turn is not worked
// on, and nothing that comes after a gap is written.
func TestInOrderLeavesOff(t *testing.T) {
	o := &Options{Slots: make(chan struct{}, 1)}
	ctx, cancel := context.WithCancel(context.Background())
	var reads, worked atomic.Int64
	written := 0
	st, err := inOrder(ctx, o, numbered(1e9, nil, &reads), func() func(c *chunk[int]) {
		return func(c *chunk[int]) {
			if worked.Add(1) == 5 {
				cancel()
			}
			c.out = append(c.out, 'x')
		}
	}, func(b []byte) error {
		written++
		return nil
	})
	if !errors.Is(err, context.Canceled) || worked.Load() != 5 || written >= 5 || st.Rows > 5 || len(o.Slots) != 0 {
		t.Errorf("%v, %d worked on, %d written, %+v, %d turns taken; want 5 worked on, fewer written", err, worked.Load(), written, st, len(o.Slots))
	}
}

// TestInOrderPanics: a panic of a worker reaches the caller with the worker's stack,
// and gives its turn back.
func TestInOrderPanics(t *testing.T) {
	o := &Options{Slots: make(chan struct{}, 1)}
	var reads atomic.Int64
	defer func() {
		text := fmt.Sprint(recover())
		if !strings.HasPrefix(text, "a defect\n") || !strings.Contains(text, "inorder_test.go") || len(o.Slots) != 0 {
			t.Errorf("recovered %.300q, %d turns taken", text, len(o.Slots))
		}
	}()
	_, err := inOrder(context.Background(), o, numbered(100, nil, &reads), func() func(c *chunk[int]) {
		return func(c *chunk[int]) {
			if c.rows == 7 {
				panic("a defect")
			}
		}
	}, func([]byte) error { return nil })
	t.Errorf("no panic, but %v", err)
}

// TestInOrderWorksInTurn: however many workers there are, no more work at once than
// there are turns.
func TestInOrderWorksInTurn(t *testing.T) {
	o := &Options{Slots: make(chan struct{}, 1)}
	var reads, atOnce, most atomic.Int64
	st, err := inOrder(context.Background(), o, numbered(50, nil, &reads), func() func(c *chunk[int]) {
		return func(c *chunk[int]) {
			most.Store(max(most.Load(), atOnce.Add(1))) // one at a time, if all is well
			time.Sleep(time.Millisecond)
			atOnce.Add(-1)
		}
	}, func([]byte) error { return nil })
	if err != nil || st.Rows != 50 || most.Load() != 1 || len(o.Slots) != 0 {
		t.Errorf("%v, %+v, %d at once, %d turns taken; want 50 rows, one at a time", err, st, most.Load(), len(o.Slots))
	}
}
