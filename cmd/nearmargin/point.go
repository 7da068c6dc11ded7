package main

import (
	"context"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

func pointFlags(f *flags) {
	f.modelFlag()
	f.motionFlags()
	f.set.Var(&f.depthKm, "depth-km", "depth of the site in `km`, positive down from sea level")
	f.set.Var(&f.uncertaintyKm, "uncertainty-km", "one standard deviation of the site's position in `km`")
	f.set.Var(&f.ageMa, "age-ma", "age of the rock in millions of years (`Ma`)")
}

// point prints the answer for one place.
func point(p *program, _ context.Context, f *flags) error {
	site, err := f.site()
	if err != nil {
		return err
	}
	b, err := load(f.model)
	if err != nil {
		return err
	}
	l, err := b.Model.Lookup(setting.Options{Motion: f.motion, Fallback: f.fallback})
	if err != nil {
		return usageError("%v", err)
	}
	var a setting.Answer
	if err := l.At(site, &a); err != nil {
		return usageError("%v", err)
	}
	_, err = p.stdout.Write(append(wire.AppendAnswer(nil, &a), '\n'))
	return err
}
