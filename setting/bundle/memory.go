package bundle

import (
	"io/fs"
	"path"
	"slices"
	"time"
)

// memory is a directory of files in memory, as far as reading a model needs one:
// it is read by name, and by a pattern within one folder.
type memory map[string][]byte

var (
	_ fs.ReadFileFS = memory{}
	_ fs.StatFS     = memory{}
	_ fs.GlobFS     = memory{}
)

// Open is there for [fs.FS]; the files have no handles.
func (m memory) Open(name string) (fs.File, error) {
	return nil, &fs.PathError{Op: "open", Path: name, Err: fs.ErrInvalid}
}

func (m memory) ReadFile(name string) ([]byte, error) {
	raw, ok := m[name]
	if !ok {
		return nil, &fs.PathError{Op: "read", Path: name, Err: fs.ErrNotExist}
	}
	return raw, nil
}

func (m memory) Stat(name string) (fs.FileInfo, error) {
	raw, ok := m[name]
	if !ok {
		return nil, &fs.PathError{Op: "stat", Path: name, Err: fs.ErrNotExist}
	}
	return memoryInfo{path.Base(name), int64(len(raw))}, nil
}

func (m memory) Glob(pattern string) (out []string, err error) {
	for name := range m {
		ok, err := path.Match(pattern, name)
		if err != nil {
			return nil, err
		}
		if ok {
			out = append(out, name)
		}
	}
	slices.Sort(out)
	return out, nil
}

type memoryInfo struct {
	name string
	size int64
}

func (i memoryInfo) Name() string     { return i.name }
func (i memoryInfo) Size() int64      { return i.size }
func (memoryInfo) Mode() fs.FileMode  { return 0o444 }
func (memoryInfo) ModTime() time.Time { return time.Time{} }
func (memoryInfo) IsDir() bool        { return false }
func (memoryInfo) Sys() any           { return nil }
