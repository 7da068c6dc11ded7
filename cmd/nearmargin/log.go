package main

import (
	"fmt"
	"io"
	"time"
)

// logWriter writes the log, a line a call. A full disk, or a reader of the log that is
// gone, stops no answer: lines that cannot be written are counted, and their number is
// the first line when the log can be written again. Its caller writes one line at a time.
type logWriter struct {
	w    io.Writer
	lost int
	torn bool // a line stands there in part
}

// Write returns what became of p.
func (l *logWriter) Write(p []byte) (int, error) {
	if l.lost > 0 {
		if err := l.tell(); err != nil {
			l.lost++
			return 0, err
		}
	}
	n, err := l.w.Write(p)
	if err != nil {
		l.lost, l.torn = 1, n > 0
	}
	return n, err
}

// tell says how many lines are missing.
func (l *logWriter) tell() error {
	var line []byte
	if l.torn {
		line = append(line, '\n')
	}
	line = fmt.Appendf(line, `{"time":%q,"level":"WARN","msg":"lines of the log were lost","lines":%d}`+"\n", time.Now().Format(time.RFC3339Nano), l.lost)
	n, err := l.w.Write(line)
	if err != nil {
		l.torn = l.torn || n > 0
		return err
	}
	l.lost, l.torn = 0, false
	return nil
}
