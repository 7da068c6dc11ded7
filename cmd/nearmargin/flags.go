package main

import (
	"flag"
	"fmt"
	"io"
	"strconv"
	"strings"
	"time"
)

// flags holds a command's flags and arguments.
type flags struct {
	c    *command
	set  *flag.FlagSet
	env  func(string) string
	args []string
	more string // what the usage text says besides the flags

	model, motion, fallback       string
	listen, out, format, dir      string
	lonColumn, latColumn          string
	depthColumn, uncertaintyCol   string
	prefix, title                 string
	asJSON                        bool
	rows                          int
	depthUnit, depthDatum         string
	elevationColumn               string
	database                      string
	databaseWait, databasePoll    time.Duration
	editions                      int
	depthKm, uncertaintyKm, ageMa optional
	serving                       serveConfig
	build                         buildOptions
	enrich                        enrichOptions
}

// optional is a number that may be absent.
type optional struct {
	given bool
	value float64
}

func (o *optional) String() string {
	if !o.given {
		return ""
	}
	return strconv.FormatFloat(o.value, 'g', -1, 64)
}

func (o *optional) Set(s string) error {
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return fmt.Errorf("%q is not a number", s)
	}
	*o = optional{true, x}
	return nil
}

func newFlags(c *command, env func(string) string) *flags {
	f := &flags{c: c, set: flag.NewFlagSet(c.name, flag.ContinueOnError), env: env}
	f.set.SetOutput(io.Discard)
	if c.flags != nil {
		c.flags(f)
	}
	return f
}

func (f *flags) modelFlag() {
	f.set.StringVar(&f.model, "model", "builtin", "the model: builtin, or a `directory`")
}

// databaseFlag adds the flag of a database's URL; why says what for.
func (f *flags) databaseFlag(why string) {
	f.set.StringVar(&f.database, "database", "", why+": a PostgreSQL `URL` or key-value string")
}

// needDatabase checks that a database was named.
func (f *flags) needDatabase() error {
	if f.database == "" {
		return usageError("--database is missing; name one, such as postgres://user@host/name, or set NEARMARGIN_DATABASE")
	}
	return nil
}

func (f *flags) motionFlags() {
	f.set.StringVar(&f.motion, "motion", "", "motion model `name`; the model's default where empty")
	f.set.StringVar(&f.fallback, "motion-fallback", "", "motion model `name` to use where the first lacks a plate")
}

// envName is the environment variable of a flag.
func envName(name string) string {
	return "NEARMARGIN_" + strings.ToUpper(strings.ReplaceAll(name, "-", "_"))
}

// parse reads the environment, then the arguments. Flags may stand before,
// between and after the arguments; a negative number is an argument.
func (f *flags) parse(args []string) error {
	var err error
	f.set.VisitAll(func(fl *flag.Flag) {
		if v := f.env(envName(fl.Name)); v != "" && err == nil {
			if e := fl.Value.Set(v); e != nil {
				err = usageError("%s: %v", envName(fl.Name), e)
			}
		}
	})
	if err != nil {
		return err
	}
	for len(args) > 0 {
		if _, numErr := strconv.ParseFloat(args[0], 64); numErr == nil || args[0] == "-" || args[0] == "" || args[0][0] != '-' {
			f.args = append(f.args, args[0])
			args = args[1:]
			continue
		}
		if args[0] == "--" {
			f.args = append(f.args, args[1:]...)
			break
		}
		// one flag at a time: what follows it may be a negative number again
		n := 1
		if name := strings.TrimLeft(args[0], "-"); !strings.Contains(name, "=") {
			if fl := f.set.Lookup(name); fl != nil && len(args) > 1 && !isBool(fl) {
				n = 2
			}
		}
		if err := f.set.Parse(args[:n]); err != nil {
			if err == flag.ErrHelp {
				return err
			}
			return usageError("%v", err)
		}
		args = args[n:]
	}
	return nil
}

// isBool reports whether a flag stands for itself, without a value after it.
func isBool(fl *flag.Flag) bool {
	b, ok := fl.Value.(interface{ IsBoolFlag() bool })
	return ok && b.IsBoolFlag()
}

// typed reports whether a flag stands among the arguments.
func (f *flags) typed(name string) bool {
	found := false
	f.set.Visit(func(fl *flag.Flag) { found = found || fl.Name == name })
	return found
}

// given reports whether a flag stands among the arguments or in the environment.
func (f *flags) given(name string) bool { return f.typed(name) || f.env(envName(name)) != "" }

// usage prints the command's flags.
func (f *flags) usage() {
	w := f.set.Output()
	fmt.Fprintf(w, "nearmargin %s [flags]\n%s\n", strings.TrimSpace(f.c.name+" "+f.c.args), f.c.summary)
	f.set.VisitAll(func(fl *flag.Flag) {
		name, text := flag.UnquoteUsage(fl)
		def := ""
		if fl.DefValue != "" {
			def = fmt.Sprintf(" (default %s)", fl.DefValue)
		}
		fmt.Fprintf(w, "  --%s %s\n        %s%s; %s\n", fl.Name, name, text, def, envName(fl.Name))
	})
	if f.more != "" {
		fmt.Fprintln(w, f.more)
	}
}

// wantArgs checks the number of arguments.
func (f *flags) wantArgs(least, most int) error {
	if len(f.args) < least || len(f.args) > most {
		return usageError("want %s, got %d arguments", f.c.args, len(f.args))
	}
	return nil
}
