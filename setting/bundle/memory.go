package bundle

import (
	"bytes"
	"io"
	"io/fs"
	"maps"
	"path"
	"slices"
	"time"
)

// memory is a model directory held in memory, by the names of its files. It holds
// what the reader asks of a directory and no more: files, their sizes, patterns.
type memory map[string][]byte

func (m memory) Open(name string) (fs.File, error) {
	raw, ok := m[name]
	if !ok {
		return nil, &fs.PathError{Op: "open", Path: name, Err: fs.ErrNotExist}
	}
	return &memoryFile{Reader: *bytes.NewReader(raw), name: name}, nil
}

// Glob returns the names that match, sorted.
func (m memory) Glob(pattern string) ([]string, error) {
	var out []string
	for _, name := range slices.Sorted(maps.Keys(m)) {
		ok, err := path.Match(pattern, name)
		if err != nil {
			return nil, err
		}
		if ok {
			out = append(out, name)
		}
	}
	return out, nil
}

type memoryFile struct {
	bytes.Reader
	name string
}

func (f *memoryFile) Stat() (fs.FileInfo, error) { return memoryInfo{path.Base(f.name), f.Size()}, nil }
func (f *memoryFile) Close() error               { return nil }

var _ io.Reader = (*memoryFile)(nil)

type memoryInfo struct {
	name string
	size int64
}

func (i memoryInfo) Name() string       { return i.name }
func (i memoryInfo) Size() int64        { return i.size }
func (i memoryInfo) Mode() fs.FileMode  { return 0o444 }
func (i memoryInfo) ModTime() time.Time { return time.Time{} }
func (i memoryInfo) IsDir() bool        { return false }
func (i memoryInfo) Sys() any           { return nil }
