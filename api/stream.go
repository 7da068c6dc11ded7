package api

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"strconv"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/annotate"
)

// The trailers that tell at the end of a batch what was done. A batch that was
// cut short has none.
const (
	trailerRows   = "Nearmargin-Rows"
	trailerErrors = "Nearmargin-Row-Errors"
)

// Why a batch was cut short, as the metric and the log name it.
const (
	cutClientLeft  = "client_left"
	cutSlowReader  = "slow_reader"
	cutSlowSender  = "slow_sender"
	cutTime        = "batch_timeout"
	cutShutdown    = "shutdown"
	cutInput       = "input_fault"
	cutServerFault = "service_fault"
)

var cutReasons = []string{cutClientLeft, cutSlowReader, cutSlowSender, cutTime, cutShutdown, cutInput, cutServerFault}

// ErrShutdown is the cause with which a server's base context is to be cancelled
// when running batches are given up.
var ErrShutdown = errors.New("the service shuts down")

var errBatchTime = errors.New("the batch took longer than it may")

// batchReader reads a batch's body. It moves the read deadline with the body's
// progress, stops when the request is over, and remembers the fault that ended
// the body, so that a client which breaks off is not taken for a fault of the
// service.
type batchReader struct {
	r      io.Reader
	ctx    context.Context
	rc     *http.ResponseController
	stall  time.Duration
	waited time.Duration // for the body, since the last progress
	gained int           // bytes since the last progress
	err    error
}

// errBodyTooLong ends a body that is longer than its form may be.
var errBodyTooLong = errors.New("body too long")

func (b *batchReader) Read(p []byte) (int, error) {
	if err := b.ctx.Err(); err != nil {
		return 0, err
	}
	start := time.Now()
	deadline := start.Add(b.stall - b.waited)
	if end, ok := b.ctx.Deadline(); ok && end.Before(deadline) {
		deadline = end
	}
	_ = b.rc.SetReadDeadline(deadline) // an in-memory recorder has none
	n, err := b.r.Read(p)
	b.waited += time.Since(start)
	if b.gained += n; b.gained >= progressBytes {
		b.gained, b.waited = 0, 0
	}
	switch {
	case err == io.EOF:
		// from here on the connection is only watched for the client's leaving
		_ = b.rc.SetReadDeadline(time.Time{})
	case err != nil:
		b.err = err
	}
	return n, err
}

// batchWriter sends the header with the first bytes, so that a fault found
// before them still gets a status of its own, and moves the write deadline.
type batchWriter struct {
	c           echo.Context
	ctx         context.Context
	rc          *http.ResponseController
	stall       time.Duration
	contentType string
	err         error
}

func (w *batchWriter) Write(p []byte) (int, error) {
	if err := w.ctx.Err(); err != nil {
		return 0, err
	}
	_ = w.rc.SetWriteDeadline(time.Now().Add(w.stall)) // an in-memory recorder has none
	r := w.c.Response()
	if !r.Committed {
		r.Header().Set(echo.HeaderContentType, w.contentType)
		r.Header().Set("Trailer", trailerRows+", "+trailerErrors)
		r.WriteHeader(http.StatusOK)
	}
	n, err := r.Write(p)
	if err != nil {
		w.err = err
	}
	return n, err
}

// finish declares what was done, in the trailers.
func (w *batchWriter) finish(st annotate.Stats) {
	_ = w.rc.SetWriteDeadline(time.Now().Add(w.stall))
	h := w.c.Response().Header()
	h.Set(trailerRows, strconv.FormatInt(st.Rows, 10))
	h.Set(trailerErrors, strconv.FormatInt(st.Errors, 10))
}

// overTime reports whether a context's time is up, also where something that the
// end of its time caused has cancelled it first.
func overTime(ctx context.Context) bool {
	end, ok := ctx.Deadline()
	return ok && !time.Now().Before(end)
}

// cutReason tells why a batch ended before its end.
func cutReason(ctx context.Context, in *batchReader, out *batchWriter, err error) string {
	var input *annotate.InputError
	switch cause := context.Cause(ctx); {
	case errors.Is(cause, ErrShutdown):
		return cutShutdown
	case overTime(ctx):
		return cutTime
	case errors.Is(out.err, os.ErrDeadlineExceeded):
		return cutSlowReader
	case errors.Is(in.err, os.ErrDeadlineExceeded):
		return cutSlowSender
	case cause != nil, in.err != nil, out.err != nil:
		return cutClientLeft
	case errors.As(err, &input):
		return cutInput
	}
	return cutServerFault
}

// bodyProblem is the problem of a body that could not be read to its end: it is longer
// than most bytes, breaks off, or came more slowly than patience says.
func bodyProblem(err error, most int64, patience string) *Problem {
	whole := new(string)
	var timeout net.Error
	switch {
	case errors.Is(err, errBodyTooLong):
		return tooLarge(FieldFault{Pointer: whole, Detail: fmt.Sprintf("the body is longer than %d bytes, which is the limit; send less, or rows as NDJSON or CSV", most)})
	case errors.As(err, &timeout) && timeout.Timeout():
		detail := "the body came too slowly: " + patience + "; send it without pauses"
		return newProblem(http.StatusRequestTimeout, kindSlow, "The request took too long", detail, FieldFault{Pointer: whole, Detail: detail})
	}
	return badRequest(FieldFault{Pointer: whole, Detail: fmt.Sprintf("the body breaks off: %v; send it whole", err)})
}
