package fetch

import (
	"archive/tar"
	"archive/zip"
	"bufio"
	"cmp"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
	"os"
	"path"
	"slices"
	"strings"
)

// archiveKind returns how an archive is packed, by its name; "" for none. What
// follows '?' or '#' in an address is no part of the name.
func archiveKind(source string) string {
	name := strings.ToLower(source)
	if isAddress(name) {
		if i := strings.IndexAny(name, "?#"); i >= 0 {
			name = name[:i]
		}
	}
	for _, k := range [...]string{".tar.gz", ".tgz", ".tar", ".zip"} {
		if strings.HasSuffix(name, k) {
			return k
		}
	}
	return ""
}

func isArchive(source string) bool { return archiveKind(source) != "" }

// unpack writes what an archive holds into files of the fetcher's directory. Names
// within the archive name no places: only their last part, and that made
// harmless, is used.
func (f *Fetcher) unpack(a File) ([]File, error) {
	var out []File
	left := f.maxBytes()
	keep := func(name string, in io.Reader) error {
		where, n, err := f.save(name, in, left)
		if err != nil {
			return fmt.Errorf("%s/%s: %w", a.Name, name, err)
		}
		left -= n
		out = append(out, File{a.Name + "/" + path.Clean("/" + name)[1:], where})
		return nil
	}
	var err error
	if archiveKind(a.Name) == ".zip" {
		err = unzip(a, keep)
	} else {
		err = untar(a, keep)
	}
	if err == nil && len(out) == 0 {
		err = fmt.Errorf("%s holds no file", a.Name)
	}
	slices.SortFunc(out, func(x, y File) int { return cmp.Compare(x.Name, y.Name) })
	return out, err
}

func untar(a File, keep func(string, io.Reader) error) (err error) {
	in, err := os.Open(a.Path)
	if err != nil {
		return err
	}
	defer in.Close()
	stream := io.Reader(bufio.NewReader(in))
	if archiveKind(a.Name) != ".tar" {
		if stream, err = gzip.NewReader(stream); err != nil {
			return fmt.Errorf("%s: %w", a.Name, err)
		}
	}
	t := tar.NewReader(stream)
	for {
		h, err := t.Next()
		switch {
		case errors.Is(err, io.EOF):
			return nil
		case err != nil:
			return fmt.Errorf("%s: %w", a.Name, err)
		case h.Typeflag != tar.TypeReg:
			continue
		}
		if err := keep(h.Name, t); err != nil {
			return err
		}
	}
}

func unzip(a File, keep func(string, io.Reader) error) error {
	z, err := zip.OpenReader(a.Path)
	if err != nil {
		return fmt.Errorf("%s: %w", a.Name, err)
	}
	defer z.Close()
	for _, m := range z.File {
		if !m.Mode().IsRegular() {
			continue
		}
		in, err := m.Open()
		if err != nil {
			return fmt.Errorf("%s/%s: %w", a.Name, m.Name, err)
		}
		err = keep(m.Name, in)
		if e := in.Close(); err == nil {
			err = e
		}
		if err != nil {
			return err
		}
	}
	return nil
}
