package main

import (
	"context"
	"fmt"
	"os"
	"strings"
	"time"

	"golang.org/x/term"

	"nearmargin/cmd/internal/fetch"
	"nearmargin/setting/bundle"
	"nearmargin/setting/bundle/published"
)

// buildOptions are the flags of model build.
type buildOptions struct {
	base, id, edition, title, licence, defaultMotion string
	steps, plates, orogens, poles, boundaries        string
	mapping, codes                                   string
	slab2, velocities, sums                          list
	maxRejected                                      float64
	timeout                                          time.Duration
	maxDownloadMB                                    int64
}

// list is a flag that may be given several times; in an environment variable the
// values stand on lines of their own.
type list []string

func (l *list) String() string { return strings.Join(*l, "\n") }

func (l *list) Set(s string) error {
	for _, line := range strings.Split(s, "\n") {
		if line = strings.TrimSpace(line); line != "" {
			*l = append(*l, line)
		}
	}
	return nil
}

func buildFlags(f *flags) {
	o := &f.build
	f.set.StringVar(&f.dir, "dir", "", "`directory` to write; it must be empty or absent")
	f.set.StringVar(&o.base, "base", "", "the model that gives what no file does: builtin, or a `directory`; none where empty")
	f.set.StringVar(&o.id, "id", "published", "the model's `id`")
	f.set.StringVar(&o.edition, "edition", "", "the model's `edition`; today's date where empty")
	f.set.StringVar(&o.title, "title", "", "the model's `title`")
	f.set.StringVar(&o.licence, "licence", "", "`licence` of the model's data; those of what it is built from where empty")
	f.set.StringVar(&o.defaultMotion, "default-motion", "", "`name` of the motion model used where none is asked for; the base's, or the first, where empty")
	f.set.StringVar(&o.steps, "steps", "", "plate boundary steps of Bird (2003), fixed columns: `SRC` is a file or an http(s) address")
	f.set.StringVar(&o.plates, "plates", "", "plate outlines of Bird (2003), .dig: `SRC`; the network is held against them")
	f.set.StringVar(&o.orogens, "orogens", "", "orogens of Bird (2003), .dig: `SRC`; they become the zones of diffuse deformation")
	f.set.StringVar(&o.poles, "poles", "", "poles of Bird (2003), fixed columns: `SRC`; they become the motion model pb2002")
	f.set.Var(&o.slab2, "slab2", "grids of Hayes et al. (2018), ZONE_slab2_LAYER_DATE.xyz[.gz]: `SRC` is a file, a directory, an archive (.tar.gz, .zip) or an address; may be repeated")
	f.set.StringVar(&o.boundaries, "boundaries", "", "boundaries as GeoJSON, instead of steps: `SRC`")
	f.set.StringVar(&o.mapping, "map", "", "which property fills which field of a boundary: `LIST` of field=PROPERTY, field='text', type:WORD=TYPE")
	f.set.Var(&o.velocities, "velocities", "a motion model's angular velocities as CSV: `NAME=SRC`; may be repeated")
	f.set.StringVar(&o.codes, "plate-codes", published.BirdCodes().String(), "publishers' plate codes and the project's: `LIST` of THEIRS=OURS")
	f.set.Var(&o.sums, "sha256", "checksum of a source, `SRC=HEX`; may be repeated")
	f.set.Float64Var(&o.maxRejected, "max-rejected", published.DefaultMaxRejected, "largest `share` of a file's lines that may be rejected")
	f.set.DurationVar(&o.timeout, "timeout", fetch.DefaultTimeout, "longest `time` of one download")
	f.set.Int64Var(&o.maxDownloadMB, "max-download-mb", fetch.DefaultMaxBytes>>20, "largest download, and largest content of an archive, in `MB`")
}

// modelBuild builds a model directory from the files of their publishers.
func modelBuild(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	o := &f.build
	q, err := o.request()
	if err != nil {
		return err
	}
	if f.dir == "" {
		return usageError("--dir is missing; name the directory to write")
	}
	if err := emptyOrAbsent(f.dir); err != nil {
		return err
	}
	sums, err := o.checksums()
	if err != nil {
		return err
	}
	if o.base != "" {
		if q.Base, err = load(o.base); err != nil {
			return err
		}
	}
	tmp, err := os.MkdirTemp("", "nearmargin-build-")
	if err != nil {
		return err
	}
	defer os.RemoveAll(tmp)
	q.Progress = p.note()
	get := &fetch.Fetcher{Dir: tmp, Sums: sums, MaxBytes: o.maxDownloadMB << 20, Timeout: o.timeout}
	if err := o.fetch(ctx, get, &q); err != nil {
		return err
	}
	b, report, err := published.Build(q)
	p.reportBuild(report)
	if err != nil {
		return err
	}
	if err := b.Write(f.dir); err != nil {
		return err
	}
	m := b.Model
	fmt.Fprintf(p.stdout, "%s written to %s: %d plates, %d boundaries, %d slabs, %d zones, motion models %s; %d warnings in warnings.csv; sha256 %s\n",
		m.Ref(), f.dir, len(m.Plates()), len(m.Network().Boundaries()), len(m.Slabs()), len(m.Zones()), strings.Join(m.MotionNames(), ", "), len(m.Warnings()), m.SHA256())
	return nil
}

// request reads the flags that need no file.
func (o *buildOptions) request() (q published.Request, err error) {
	q.Identity = bundle.Identity{ID: o.id, Edition: o.edition, Title: o.title, Licence: o.licence, DefaultMotion: o.defaultMotion}
	if q.Identity.Edition == "" {
		q.Identity.Edition = time.Now().UTC().Format("2006.01.02")
	}
	q.MaxRejected = o.maxRejected
	if !(o.maxRejected > 0 && o.maxRejected <= 1) {
		return q, usageError("--max-rejected is %g; it must be more than 0 and at most 1", o.maxRejected)
	}
	if o.maxDownloadMB < 1 || o.timeout <= 0 {
		return q, usageError("--max-download-mb and --timeout must be more than 0")
	}
	if q.Codes, err = published.ParseCodes(o.codes); err != nil {
		return q, usageError("--plate-codes: %v", err)
	}
	if q.Mapping, err = published.ParseMapping(o.mapping); err != nil {
		return q, usageError("--map: %v", err)
	}
	if o.mapping != "" && o.boundaries == "" {
		return q, usageError("--map says what the properties of --boundaries mean, and there is no --boundaries")
	}
	switch {
	case o.steps != "" && o.boundaries != "":
		return q, usageError("--steps and --boundaries are both given; a model has one network")
	case o.base == "" && o.steps == "" && o.boundaries == "":
		return q, usageError("there are no boundaries: give --steps, --boundaries or --base")
	case o.base == "" && o.poles == "" && len(o.velocities) == 0:
		return q, usageError("there are no angular velocities: give --poles, --velocities or --base")
	case o.base != "" && o.steps+o.boundaries+o.plates+o.orogens+o.poles == "" && len(o.slab2)+len(o.velocities) == 0:
		return q, usageError("nothing is given to build from; model export writes a model as it is")
	}
	for _, v := range o.velocities {
		name, src, ok := strings.Cut(v, "=")
		if !ok || name == "" || src == "" {
			return q, usageError("--velocities %q: want NAME=SRC", v)
		}
	}
	return q, nil
}

// checksums reads --sha256 SRC=HEX; SRC may hold an equals sign itself.
func (o *buildOptions) checksums() (map[string]string, error) {
	out := map[string]string{}
	for _, s := range o.sums {
		i := strings.LastIndexByte(s, '=')
		if i < 1 || len(s)-i-1 != 64 || strings.Trim(strings.ToLower(s[i+1:]), "0123456789abcdef") != "" {
			return nil, usageError("--sha256 %q: want SRC=HEX, HEX of 64 digits", s)
		}
		out[s[:i]] = s[i+1:]
	}
	return out, nil
}

// fetch brings all sources within reach.
func (o *buildOptions) fetch(ctx context.Context, get *fetch.Fetcher, q *published.Request) error {
	for _, x := range [...]struct {
		source string
		into   **published.File
	}{{o.steps, &q.Steps}, {o.plates, &q.Plates}, {o.orogens, &q.Orogens}, {o.poles, &q.Poles}, {o.boundaries, &q.Boundaries}} {
		if x.source == "" {
			continue
		}
		q.Progress("fetching " + x.source)
		f, err := get.One(ctx, x.source)
		if err != nil {
			return err
		}
		*x.into = &published.File{Name: f.Name, Open: f.Open}
	}
	for _, s := range o.slab2 {
		q.Progress("fetching " + s)
		files, err := get.All(ctx, s)
		if err != nil {
			return err
		}
		for _, f := range files {
			q.Slab2 = append(q.Slab2, published.File{Name: f.Name, Open: f.Open})
		}
	}
	for _, v := range o.velocities {
		name, src, _ := strings.Cut(v, "=")
		q.Progress("fetching " + src)
		f, err := get.One(ctx, src)
		if err != nil {
			return err
		}
		q.Velocities = append(q.Velocities, published.Velocities{Name: name, File: published.File{Name: f.Name, Open: f.Open}})
	}
	if unused := get.Unused(); len(unused) > 0 {
		return usageError("--sha256 names %s, which is no source", strings.Join(unused, ", "))
	}
	return nil
}

func emptyOrAbsent(dir string) error {
	if have, err := os.ReadDir(dir); err == nil && len(have) > 0 {
		return fmt.Errorf("%s is not empty; name a new directory", dir)
	}
	return nil
}

// reportBuild names every rejected line, and what else the operator should know.
func (p *program) reportBuild(r *published.Report) {
	for _, t := range r.Tallies {
		for _, x := range t.Rejects {
			fmt.Fprintln(p.stderr, x)
		}
		if n := t.Rejected - len(t.Rejects); n > 0 {
			fmt.Fprintf(p.stderr, "%s: %d more\n", t.File, n)
		}
	}
	if n := r.Rejected(); n > 0 {
		fmt.Fprintf(p.stderr, "%d lines were rejected; they are named above and in the model's warnings.csv\n", n)
	}
	for _, s := range r.Superseded {
		fmt.Fprintf(p.stderr, "slab of the base superseded: %s\n", s)
	}
	if n := len(r.Skipped); n > 0 {
		fmt.Fprintf(p.stderr, "%d files are not named as grids of slabs and were passed over, such as %s\n", n, r.Skipped[0])
	}
}

// note returns a function that shows what is being done where standard error is a
// terminal, and does nothing elsewhere.
func (p *program) note() func(string) {
	f, ok := p.stderr.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		return func(string) {}
	}
	return func(what string) { fmt.Fprintf(f, "\r\x1b[K%.100s ...\r", what) }
}
