package main

import (
	"bytes"
	"fmt"
	"io"
	"sync/atomic"
	"time"
)

const (
	logRoom  = 1000        // lines that may wait to be written
	logFlush = time.Second // that the last lines have at the end
)

// logWriter writes the log, a line a call, without holding up whoever logs. A full
// disk, and a reader of the log that stands still or is gone, stop no answer: lines that
// cannot be written are counted, and their number is told when it can be.
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
	for {
		select {
		case line := <-l.lines:
			l.put(line)
		case <-l.end:
			for range len(l.lines) {
				l.put(<-l.lines)
			}
			return
		}
	}
}

// put writes a line, and before it how many are missing.
func (l *logWriter) put(line []byte) {
	if n := l.lost.Load(); n > 0 {
		var told []byte
		if l.torn {
			told = append(told, '\n')
		}
		told = fmt.Appendf(told, `{"time":%q,"level":"WARN","msg":"lines of the log were lost","lines":%d}`+"\n", time.Now().Format(time.RFC3339Nano), n)
		if !l.whole(told) {
			l.lost.Add(1)
			return
		}
		l.lost.Add(-n)
	}
	if !l.whole(line) {
		l.lost.Add(1)
	}
}

// whole writes and reports whether all of it is there.
func (l *logWriter) whole(p []byte) bool {
	n, err := l.w.Write(p)
	if err != nil {
		l.torn = l.torn || n > 0
		return false
	}
	l.torn = false
	return true
}
