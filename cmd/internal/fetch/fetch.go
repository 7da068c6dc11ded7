// Package fetch brings the files that an operator names within reach: a file, a
// directory, or an http or https address; also what lies within an archive
// (.tar, .tar.gz, .tgz, .zip). It bounds sizes and times and checks checksums.
package fetch

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"io/fs"
	"net/http"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"time"
)

// The defaults of a [Fetcher].
const (
	DefaultMaxBytes = 4 << 30
	DefaultTimeout  = 30 * time.Minute // of one download, from the request to its last byte
)

// File is one file that was brought within reach.
type File struct {
	Name string // as the operator named it; for a file within a directory or an archive that, '/', and its own name
	Path string // where it lies
}

// Open opens the file.
func (f File) Open() (io.ReadCloser, error) { return os.Open(f.Path) }

// Fetcher fetches files. The zero value has the defaults and needs a Dir.
type Fetcher struct {
	Dir      string            // an existing directory for downloads and what archives hold; the caller removes it
	Sums     map[string]string // SHA-256 in hex, by source as the operator names it
	MaxBytes int64             // of one download, and of all that one archive holds
	Timeout  time.Duration
	Client   *http.Client

	checked map[string]bool
	number  int
}

// One fetches a source that must be a single file.
func (f *Fetcher) One(ctx context.Context, source string) (File, error) {
	list, err := f.All(ctx, source)
	if err != nil {
		return File{}, err
	}
	if len(list) != 1 {
		return File{}, fmt.Errorf("%s holds %d files; name one of them", source, len(list))
	}
	return list[0], nil
}

// All fetches a source: one file, all that a directory holds, or all that an
// archive holds, sorted by name.
func (f *Fetcher) All(ctx context.Context, source string) ([]File, error) {
	file := File{source, source}
	if isAddress(source) {
		var err error
		if file.Path, err = f.download(ctx, source); err != nil {
			return nil, fmt.Errorf("%s: %w", source, err)
		}
	}
	st, err := os.Stat(file.Path)
	if err != nil {
		return nil, fmt.Errorf("%w; name a file, a directory, or an http or https address", err)
	}
	if st.IsDir() {
		if f.Sums[source] != "" {
			return nil, fmt.Errorf("%s is a directory; a checksum is of one file", source)
		}
		return listDir(source)
	}
	if err := f.checkSum(source, file.Path); err != nil {
		return nil, err
	}
	if isArchive(source) {
		return f.unpack(file)
	}
	return []File{file}, nil
}

// Unused returns the sources of checksums that no fetched source has.
func (f *Fetcher) Unused() []string {
	var out []string
	for source := range f.Sums {
		if !f.checked[source] {
			out = append(out, source)
		}
	}
	slices.Sort(out)
	return out
}

func isAddress(s string) bool {
	s = strings.ToLower(s)
	return strings.HasPrefix(s, "http://") || strings.HasPrefix(s, "https://")
}

func listDir(dir string) ([]File, error) {
	var out []File
	err := filepath.WalkDir(dir, func(p string, e fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if e.Type().IsRegular() {
			out = append(out, File{filepath.ToSlash(p), p})
		}
		return nil
	})
	if err == nil && len(out) == 0 {
		err = fmt.Errorf("%s holds no file", dir)
	}
	return out, err
}

func (f *Fetcher) checkSum(source, at string) error {
	want := strings.ToLower(f.Sums[source])
	if want == "" {
		return nil
	}
	if f.checked == nil {
		f.checked = map[string]bool{}
	}
	f.checked[source] = true
	in, err := os.Open(at) // #nosec G304 -- the operator's own path
	if err != nil {
		return err
	}
	defer in.Close()
	h := sha256.New()
	if _, err := io.Copy(h, in); err != nil {
		return err
	}
	if got := hex.EncodeToString(h.Sum(nil)); got != want {
		return fmt.Errorf("%s: its sha256 is %s; it should be %s", source, got, want)
	}
	return nil
}

// temporary creates a file in the fetcher's directory.
func (f *Fetcher) temporary(name string) (*os.File, error) {
	f.number++
	return os.Create(filepath.Join(f.Dir, fmt.Sprintf("%04d-%s", f.number, safeName(name))))
}

// safeName keeps the last part of a path, and of it what is harmless.
func safeName(name string) string {
	name = path.Base(strings.ReplaceAll(name, `\`, "/"))
	if i := strings.IndexAny(name, "?#"); i >= 0 {
		name = name[:i]
	}
	return strings.Map(func(r rune) rune {
		if r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("._-", r) {
			return r
		}
		return '_'
	}, name)
}

func (f *Fetcher) maxBytes() int64 {
	if f.MaxBytes > 0 {
		return f.MaxBytes
	}
	return DefaultMaxBytes
}

// save copies a stream of at most max bytes to a new file.
func (f *Fetcher) save(name string, in io.Reader, max int64) (where string, n int64, err error) {
	out, err := f.temporary(name)
	if err != nil {
		return "", 0, err
	}
	n, err = io.Copy(out, io.LimitReader(in, max+1))
	if e := out.Close(); err == nil {
		err = e
	}
	if err == nil && n > max {
		err = fmt.Errorf("has more than %d bytes", max)
	}
	return out.Name(), n, err
}
