package main

import (
	"context"
	"fmt"
	"runtime/debug"
)

// release is the version of the program.
const release = "0.1.0"

// commit returns the commit that the program was built from, as the toolchain
// recorded it.
func commit() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	rev, dirty := "unknown", ""
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision":
			rev = s.Value
		case s.Key == "vcs.modified" && s.Value == "true":
			dirty = "+changes"
		}
	}
	return rev + dirty
}

// version prints what runs.
func version(p *program, _ context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	b, err := load(builtinName)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.stdout, "nearmargin %s\ncommit %s\nmodel %s sha256 %s\n", release, commit(), b.Model.Ref(), b.Model.SHA256())
	return nil
}
