package annotate

import (
	"errors"
	"io"
	"slices"
)

// errRowTooLong stops a reader that is asked for more than one row may have.
var errRowTooLong = errors.New("row too long")

// guard hands bytes on until more than a row's worth of them has been read since
// the last mark, so that a parser which buffers a whole row stays bounded.
type guard struct {
	r      io.Reader
	read   int64
	marked int64
	limit  int64
	ended  bool // the end has been met
	last   byte // the last byte that ends no line
}

// mark says that the input has been dealt with up to an offset.
func (g *guard) mark(offset int64) { g.marked = offset }

func (g *guard) Read(p []byte) (int, error) {
	if g.read-g.marked > g.limit {
		return 0, errRowTooLong
	}
	n, err := g.r.Read(p)
	g.read += int64(n)
	g.ended = err == io.EOF
	for _, c := range slices.Backward(p[:n]) {
		if c != '\r' && c != '\n' {
			g.last = c
			break
		}
	}
	return n, err
}
