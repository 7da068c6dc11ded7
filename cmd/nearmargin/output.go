package main

import (
	"errors"
	"io"
	"os"
	"path/filepath"
)

// watchedOutput remembers the first fault of standard output, so that no command
// ends as if all were well when its disk is full.
type watchedOutput struct {
	w   io.Writer
	err error
}

func (o *watchedOutput) Write(p []byte) (int, error) {
	n, err := o.w.Write(p)
	if err != nil && o.err == nil {
		o.err = err
	}
	return n, err
}

// unfinished is the ending of a file that is being written. One that is left tells of a
// run that was killed, and may be removed.
const unfinished = ".unfinished"

// writeOut writes to standard output, or to a file that appears under its name
// only when it is whole and on the disk. What is no file, such as /dev/null, is
// written to as it stands.
func (p *program) writeOut(name string, write func(io.Writer) error) error {
	if name == "" {
		return write(p.stdout)
	}
	if st, err := os.Stat(name); err == nil && !st.Mode().IsRegular() { // #nosec G703 G304 -- the operator's own path
		f, err := os.OpenFile(name, os.O_WRONLY, 0)
		if err != nil {
			return err
		}
		return errors.Join(write(f), f.Close())
	}
	tmp, err := os.CreateTemp(filepath.Dir(name), "."+filepath.Base(name)+".*"+unfinished)
	if err != nil {
		return err
	}
	defer os.Remove(tmp.Name()) // no effect once it is renamed
	err = write(tmp)
	if err == nil {
		err = tmp.Chmod(0o644)
	}
	if err == nil {
		err = tmp.Sync()
	}
	if err = errors.Join(err, tmp.Close()); err != nil {
		return err
	}
	return os.Rename(tmp.Name(), name) // #nosec G703 -- the operator's own path
}
