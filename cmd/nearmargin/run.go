package main

import (
	"cmp"
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"strings"
)

// The exit statuses.
const (
	exitDone      = 0
	exitFailed    = 1
	exitUsage     = 2
	exitRowErrors = 3 // done, but some rows carry an error
)

// program is one run of the command, with all that it touches of the outside.
type program struct {
	env            func(string) string
	stdin          io.Reader
	stdout, stderr io.Writer
}

// command is one subcommand.
type command struct {
	name    string
	args    string // what follows the name, for the usage text
	summary string
	run     func(p *program, ctx context.Context, f *flags) error
	flags   func(f *flags)
}

// commands lists the subcommands in the order in which the usage text does.
var commands = []command{
	{"serve", "", "answer over HTTP", serve, serveFlags},
	{"point", "LON LAT", "answer for one place, as JSON", point, pointFlags},
	{"annotate", "[FILE|-]", "add the answer to every row of a CSV, NDJSON or GeoJSON file, or of a table in PostGIS", annotateFile, annotateFlags},
	{"section", "LON LAT", "draw the slab along a line through a place, as SVG or JSON", section, sectionFlags},
	{"map", "FILE|-", "draw an annotated file as a location map, as SVG", drawMap, mapFlags},
	{"summary", "FILE|-", "count an annotated file by setting, boundary type and distance", summary, summaryFlags},
	{"model check", "DIR|builtin", "check a model and name the place of every fault", modelCheck, nil},
	{"model export", "NAME", "write a model as a directory", modelExport, exportFlags},
	{"model build", "", "build a model directory from published data sets", modelBuild, buildFlags},
	{"model import", "DIR|builtin", "write a model into a database as a new edition", modelImport, importFlags},
	{"model list", "", "list the editions in a database", modelList, listFlags},
	{"model activate", "ID@EDITION", "make an edition the active one", modelActivate, activateFlags},
	{"model diff", "A B", "tell what changed from one model to another, and by how much", modelDiff, diffFlags},
	{"migrate", "", "bring a database's schema to the newest version", migrate, migrateFlags},
	{"model rules", "", "print the rule table", modelRules, nil},
	{"health", "URL", "ask a service whether it is well; for health checks", health, nil},
	{"version", "", "print version, commit and model edition", version, nil},
}

// errUsage marks an error of the command line.
var errUsage = errors.New("wrong usage")

func usageError(format string, args ...any) error {
	return fmt.Errorf("%w: %s", errUsage, fmt.Sprintf(format, args...))
}

// errRows says that the work is done but rows carry errors.
var errRows = errors.New("some rows carry an error")

// run runs the command and returns the exit status.
func (p *program) run(ctx context.Context, args []string) int {
	c, rest := find(args)
	if c == nil {
		if len(args) == 1 && (args[0] == "help" || args[0] == "--help" || args[0] == "-h") {
			if _, err := fmt.Fprint(p.stdout, usage()); err != nil {
				fmt.Fprintln(p.stderr, "nearmargin: "+err.Error())
				return exitFailed
			}
			return exitDone
		}
		if len(args) > 0 {
			fmt.Fprintf(p.stderr, "nearmargin: there is no command %q\n", strings.Join(args[:min(2, len(args))], " "))
		}
		fmt.Fprint(p.stderr, usage())
		return exitUsage
	}
	out := &watchedOutput{w: p.stdout}
	p.stdout = out
	f := newFlags(c, p.env)
	err := f.parse(rest)
	switch {
	case errors.Is(err, flag.ErrHelp):
		f.set.SetOutput(p.stdout)
		f.usage()
		err = nil
	case err == nil:
		err = c.run(p, ctx, f)
	}
	if err == nil || errors.Is(err, errRows) {
		err = cmp.Or(out.err, err)
	}
	switch {
	case err == nil:
		return exitDone
	case errors.Is(err, errRows):
		fmt.Fprintln(p.stderr, "nearmargin: "+err.Error())
		return exitRowErrors
	case errors.Is(err, errUsage):
		fmt.Fprintf(p.stderr, "nearmargin %s: %v\nnearmargin %s --help says more\n", c.name, err, c.name)
		return exitUsage
	}
	fmt.Fprintf(p.stderr, "nearmargin %s: %v\n", c.name, err)
	return exitFailed
}

// find returns the command that the arguments name, and the arguments after it.
func find(args []string) (*command, []string) {
	for i := range commands {
		words := strings.Fields(commands[i].name)
		if len(args) >= len(words) && strings.Join(args[:len(words)], " ") == commands[i].name {
			return &commands[i], args[len(words):]
		}
	}
	return nil, nil
}

func usage() string {
	var b strings.Builder
	b.WriteString("nearmargin tells in what tectonic setting a place lies.\n\n")
	for _, c := range commands {
		fmt.Fprintf(&b, "  nearmargin %-28s %s\n", strings.TrimSpace(c.name+" "+c.args), c.summary)
	}
	b.WriteString("\nEvery flag has an environment variable: --lon-column is NEARMARGIN_LON_COLUMN.\n" +
		"Exit status: 0 done, 1 failed, 2 wrong usage, 3 done but some rows carry an error.\n")
	return b.String()
}
