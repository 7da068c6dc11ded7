package bundle

import (
	"errors"
	"fmt"
)

// errNotUTF8 is the fault of text in another encoding.
var errNotUTF8 = errors.New("the text is not valid UTF-8; save the file as UTF-8")

// FileError is a fault in one file of a model directory.
type FileError struct {
	File   string // path within the directory
	Line   int    // from 1; 0 where it has none
	Detail string
	Err    error // the cause, nil where Detail says it all
}

func (e *FileError) Error() string {
	at := e.File
	if e.Line > 0 {
		at = fmt.Sprintf("%s:%d", e.File, e.Line)
	}
	switch {
	case e.Err == nil:
		return at + ": " + e.Detail
	case e.Detail == "":
		return at + ": " + e.Err.Error()
	}
	return at + ": " + e.Detail + ": " + e.Err.Error()
}

func (e *FileError) Unwrap() error { return e.Err }

func fault(file string, line int, format string, args ...any) error {
	return &FileError{File: file, Line: line, Detail: fmt.Sprintf(format, args...)}
}
