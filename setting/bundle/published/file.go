package published

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"fmt"
	"io"
	"path"
	"strings"
	"unicode/utf8"
)

// File is one file of a publisher.
type File struct {
	Name string // as the operator named it, for messages; its last part may say what it holds
	Open func() (io.ReadCloser, error)
}

// base returns the last part of the name.
func (f File) base() string { return path.Base(strings.ReplaceAll(f.Name, `\`, "/")) }

// Reject is a line, or a feature, that could not be read.
type Reject struct {
	File   string
	Line   int // from 1; of a feature or an outline the line on which it begins
	Reason string
}

func (r Reject) String() string { return fmt.Sprintf("%s:%d: %s", r.File, r.Line, r.Reason) }

// Tally counts what was read of one file.
type Tally struct {
	File     string
	Read     int      // lines, outlines or features that were taken
	Rejected int      // those that were left out
	Rejects  []Reject // the first thousand of them
}

const maxRejects = 1000

func (t *Tally) reject(line int, format string, args ...any) {
	t.Rejected++
	if len(t.Rejects) < maxRejects {
		t.Rejects = append(t.Rejects, Reject{t.File, line, fmt.Sprintf(format, args...)})
	}
}

const (
	maxLineBytes = 64 << 10
	maxTextBytes = 4 << 30 // of one file, decompressed
)

// textOf opens a file's text, decompressed where its name ends in .gz.
func textOf(f File) (io.Reader, func() error, error) {
	in, err := f.Open()
	if err != nil {
		return nil, nil, err
	}
	if !strings.HasSuffix(strings.ToLower(f.Name), ".gz") {
		return io.LimitReader(in, maxTextBytes), in.Close, nil
	}
	z, err := gzip.NewReader(bufio.NewReader(in))
	if err != nil {
		_ = in.Close()
		return nil, nil, fmt.Errorf("%s: %w", f.Name, err)
	}
	return io.LimitReader(z, maxTextBytes), in.Close, nil
}

// eachLine visits the lines of a text that are not blank. A line that is not
// UTF-8 is visited with its bad bytes replaced: authors' names in remarks are
// spelt in many encodings, and numbers in one.
func eachLine(name string, text io.Reader, visit func(line int, s string)) error {
	sc := bufio.NewScanner(text)
	sc.Buffer(make([]byte, 0, 4096), maxLineBytes)
	n := 0
	for sc.Scan() {
		n++
		raw := bytes.TrimRight(sc.Bytes(), " \t\r\x1a")
		if n == 1 {
			raw = bytes.TrimPrefix(raw, []byte("\ufeff"))
		}
		if len(raw) == 0 {
			continue
		}
		s := string(raw)
		if !utf8.ValidString(s) {
			s = strings.ToValidUTF8(s, "?")
		}
		visit(n, s)
	}
	if err := sc.Err(); err != nil {
		return fmt.Errorf("%s:%d: %w", name, n+1, err)
	}
	return nil
}
