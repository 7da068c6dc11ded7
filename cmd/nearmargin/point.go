package main

import (
	"context"
	"strconv"

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
	if err := f.wantArgs(2, 2); err != nil {
		return err
	}
	var xy [2]float64
	for i, name := range [...]string{"LON", "LAT"} {
		var err error
		if xy[i], err = strconv.ParseFloat(f.args[i], 64); err != nil {
			return usageError("%s: %q is not a number in decimal degrees", name, f.args[i])
		}
	}
	site := setting.SiteAt(xy[0], xy[1])
	for _, o := range [...]struct {
		from *optional
		to   *float64
	}{{&f.depthKm, &site.DepthKm}, {&f.uncertaintyKm, &site.UncertaintyKm}, {&f.ageMa, &site.AgeMa}} {
		if o.from.given {
			*o.to = o.from.value
		}
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
