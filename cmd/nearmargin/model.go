package main

import (
	"context"
	"fmt"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/bundle"
	"nearmargin/store"
)

func exportFlags(f *flags) {
	f.set.StringVar(&f.dir, "dir", "", "`directory` to write; it must be empty or absent")
	f.databaseFlag("where NAME is ID@EDITION, or ID for its active edition, in a database")
}

// modelCheck checks a model and names the place of every fault.
func modelCheck(p *program, _ context.Context, f *flags) error {
	if err := f.wantArgs(1, 1); err != nil {
		return err
	}
	b, err := load(f.args[0])
	if err != nil {
		return err
	}
	m := b.Model
	faults := m.Network().Faults()
	for _, x := range faults {
		fmt.Fprintf(p.stdout, "%.4f %.4f %s: %s\n", x.At.Lon, x.At.Lat, x.Code, x.Detail)
	}
	for _, w := range m.Warnings() {
		if strings.HasPrefix(w.Code, "network_") {
			continue // found again above
		}
		at := ""
		if w.Placed {
			at = fmt.Sprintf("%.4f %.4f ", w.At.Lon, w.At.Lat)
		}
		fmt.Fprintf(p.stdout, "warning kept with the edition: %s%s: %s\n", at, w.Code, w.Detail)
	}
	bounded := map[string]bool{}
	for _, code := range m.Network().Plates() {
		bounded[code] = true
	}
	unbounded := 0
	for _, pl := range m.Plates() {
		if !bounded[pl.Code] {
			unbounded++
			fmt.Fprintf(p.stdout, "plate %s (%s) bounds nothing\n", pl.Code, pl.Name)
		}
	}
	fmt.Fprintf(p.stdout, "%s: %d plates, %d boundaries, %d triple junctions, %d slabs, %d zones, %d hotspots, %d motion models; sha256 %s\n",
		m.Ref(), len(m.Plates()), len(m.Network().Boundaries()), len(m.Junctions()), len(m.Slabs()), len(m.Zones()), len(m.Hotspots()), len(m.MotionNames()), m.SHA256())
	if n := len(faults) + unbounded; n > 0 {
		return fmt.Errorf("%d faults", n)
	}
	return nil
}

// modelExport writes a model's canonical files.
func modelExport(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(1, 1); err != nil {
		return err
	}
	if f.dir == "" {
		return usageError("--dir is missing; name the directory to write")
	}
	var b *bundle.Bundle
	var err error
	if f.database == "" {
		b, err = load(f.args[0])
	} else {
		err = withStore(ctx, f, func(s *store.Store) (err error) {
			b, err = s.Load(ctx, f.args[0])
			return err
		})
	}
	if err != nil {
		return err
	}
	if err := b.Write(f.dir); err != nil {
		return err
	}
	fmt.Fprintf(p.stdout, "%s written to %s: %d files, sha256 %s\n", b.Model.Ref(), f.dir, len(b.Files()), b.Model.SHA256())
	return nil
}

// modelRules prints the rule table.
func modelRules(p *program, _ context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	_, err := fmt.Fprint(p.stdout, setting.RuleTable())
	return err
}
