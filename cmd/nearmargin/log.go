package main

import (
	"bytes"
	"fmt"
	"io"
	"sync/atomic"
	"time"
)

const (
	logRoom   = 1000                  // lines that may wait to be written
	logGather = 10 * time.Millisecond // how long a line may wait for others to be written with
	logFlush  = time.Second           // that the last lines have at the end
)

// logWriter writes the log without holding up whoever logs: lines that come close
// together are written at once. A full disk, and a reader of the log that stands still or
// is gone, stop no answer: lines that cannot be written are counted, and their number is
// told when it can be.
type logWriter struct {
	w     io.Writer
	lines chan []byte
	lost  atomic.Int64 // lines, since the last time that it was told
	end   chan struct{}
	ended chan struct{}
	torn  bool // the last line stands there in part
}

func newLogWriter(w io.Writer) *logWriter {
	l := &logWriter{w: w, lines: make(chan []byte, logRoom), end: make(chan struct{}), ended: make(chan struct{})}
	go l.run()
	return l
}

// Write takes a line. It never fails.
func (l *logWriter) Write(line []byte) (int, error) {
	select {
	case l.lines <- bytes.Clone(line):
	default:
		l.lost.Add(1)
	}
	return len(line), nil
}

// close writes what waits, as far as that goes at once.
func (l *logWriter) close() {
	close(l.end)
	select {
	case <-l.ended:
	case <-time.After(logFlush):
	}
}

func (l *logWriter) run() {
	defer close(l.ended)
	var text []byte
	for {
		select {
		case line := <-l.lines:
			time.Sleep(logGather) // a send meanwhile wakes nobody
			text = l.waiting(append(text[:0], line...))
			l.put(text)
		case <-l.end:
			l.put(l.waiting(text[:0]))
			return
		}
	}
}

// waiting appends the lines that wait.
func (l *logWriter) waiting(text []byte) []byte {
	for range len(l.lines) {
		text = append(text, <-l.lines...)
	}
	return text
}

// put writes lines, and before them how many are missing.
func (l *logWriter) put(text []byte) {
	if n := l.lost.Load(); n > 0 {
		var told []byte
		if l.torn {
			told = append(told, '\n')
		}
		told = fmt.Appendf(told, `{"time":%q,"level":"WARN","msg":"lines of the log were lost","lines":%d}`+"\n", time.Now().Format(time.RFC3339Nano), n)
		if l.write(told) < len(told) {
			l.lost.Add(int64(bytes.Count(text, newline)))
			return
		}
		l.lost.Add(-n)
	}
	if n := l.write(text); n < len(text) {
		l.lost.Add(int64(bytes.Count(text[n:], newline))) // the line that stands there in part as well
	}
}

var newline = []byte("\n")

// write writes what it can and returns how much that is.
func (l *logWriter) write(p []byte) int {
	n, err := l.w.Write(p)
	if err == nil {
		n = len(p)
	}
	if n > 0 {
		l.torn = p[n-1] != '\n'
	}
	return n
}
