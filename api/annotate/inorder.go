package annotate

import (
	"context"
	"errors"
	"fmt"
	"runtime"
	"runtime/debug"
	"sync"
)

// chunk is a run of rows on its way through [inOrder]. It is used again.
type chunk[R any] struct {
	rows   R      // what the reader put in
	n      int64  // rows in it
	errors int64  // of them, those that carry an error
	out    []byte // what the worker made of them
	err    error  // why the worker did not work
	done   chan struct{}
}

// The size of a chunk: it is full with the first of the two.
const (
	chunkRows  = 128
	chunkBytes = 64 << 10
)

// inOrder reads chunks of rows, has them worked on by several goroutines, and
// writes them in the order in which they were read. No more than a few chunks a
// worker are under way at a time, whichever of the three is slow.
//
// read fills a chunk and reports whether there may be more; what it put in before
// an error is still worked on and written. Each worker has a function of its own
// from newWorker. After a failure of write nothing more is read than is under way;
// after the end of the context nothing more is worked on or written. A panic of a
// worker becomes one of the caller.
func inOrder[R any](ctx context.Context, o *Options,
	read func(c *chunk[R]) (more bool, err error),
	newWorker func() func(c *chunk[R]),
	write func(out []byte) error,
) (Stats, error) {
	workers := runtime.GOMAXPROCS(0)
	window := 2*workers + 1
	free := make(chan *chunk[R], window)
	todo, order := make(chan *chunk[R], window), make(chan *chunk[R], window)
	for range window {
		free <- &chunk[R]{done: make(chan struct{}, 1)}
	}
	var wg sync.WaitGroup
	for range workers {
		wg.Go(func() {
			work, turn := newWorker(), turn{slots: o.Slots}
			for c := range todo {
				c.out, c.errors = c.out[:0], 0
				if c.err = turn.take(ctx); c.err == nil {
					if c.err = guarded(work, c); c.err == nil {
						c.err = ctx.Err() // the worker may have left off there
					}
					turn.give()
				}
				c.done <- struct{}{}
			}
		})
	}
	var st Stats
	var writeErr error
	failed := make(chan struct{})
	wg.Go(func() {
		for c := range order {
			<-c.done
			if writeErr == nil {
				if writeErr = c.err; writeErr == nil {
					writeErr = write(c.out)
				}
				if writeErr != nil {
					close(failed)
				}
				if c.err == nil {
					st.Rows += c.n
					st.Errors += c.errors
				}
				if o.Progress != nil {
					o.Progress(st)
				}
			}
			free <- c
		}
	})
	var readErr error
	for more := true; more && readErr == nil; {
		if readErr = ctx.Err(); readErr != nil {
			break
		}
		select {
		case <-failed:
			more = false
			continue
		default:
		}
		c := <-free
		c.n = 0
		if readErr = o.turn.take(ctx); readErr == nil {
			more, readErr = read(c)
			o.turn.give()
		}
		todo <- c
		order <- c
	}
	close(todo)
	close(order)
	wg.Wait()
	var p *workerPanic
	if errors.As(writeErr, &p) {
		panic(p.text)
	}
	if writeErr != nil {
		return st, writeErr
	}
	return st, readErr
}

// workerPanic is a panic on its way from a worker to the caller.
type workerPanic struct{ text string }

func (p *workerPanic) Error() string { return p.text }

// guarded does a worker's work. A panic becomes an error that holds its stack.
func guarded[R any](work func(c *chunk[R]), c *chunk[R]) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = &workerPanic{fmt.Sprintf("%v\n%s", p, debug.Stack())}
		}
	}()
	work(c)
	return nil
}
