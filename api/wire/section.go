package wire

import (
	"math"

	"nearmargin/setting"
)

// AppendSection appends the section as one JSON object. All keys are always
// present.
func AppendSection(b []byte, s *setting.Section) []byte {
	o := open(b)
	o.key("site")
	o.b = appendSite(o.b, &s.Site)
	o.num("site_distance_km", s.SiteKm, decimalsKm)
	o.key("slab")
	o.b = appendSectionSlab(o.b, s)
	o.key("slab_below_site")
	if s.IsBelow {
		list := appendSlabs(nil, []setting.SlabAnswer{s.Below})
		o.b = append(o.b, list[1:len(list)-1]...)
	} else {
		o.b = append(o.b, "null"...)
	}
	o.num("outside_slab_km", s.OutsideKm, decimalsKm)
	o.key("line")
	o.b = appendSectionLine(o.b, &s.Line)
	o.key("trench")
	if s.HasTrench {
		o.b = appendTrench(o.b, &s.Trench)
	} else {
		o.b = append(o.b, "null"...)
	}
	o.key("arc_band")
	o.b = appendArc(o.b, &s.Arc)
	o.key("samples")
	o.b = appendSamples(o.b, s)
	o.key("other_slabs")
	o.b = append(o.b, '[')
	for i := range s.Profiles[1:] {
		if i > 0 {
			o.b = append(o.b, ',')
		}
		p := open(o.b)
		p.str("slab", s.Profiles[1+i].Slab.ID)
		p.str("name", s.Profiles[1+i].Slab.Name)
		p.str("kind", s.Profiles[1+i].Slab.Kind.String())
		o.b = p.close()
	}
	o.b = append(o.b, ']')
	o.foot(s.Model, s.Notes.All())
	return o.close()
}

func appendSectionSlab(b []byte, s *setting.Section) []byte {
	x := s.Slab
	o := open(b)
	o.str("slab", x.ID)
	o.str("name", x.Name)
	o.str("kind", x.Kind.String())
	o.str("subducting_plate", x.Subducting)
	o.str("overriding_plate", x.Overriding)
	o.str("source", x.Source)
	o.str("source_status", x.SourceStatus)
	return o.close()
}

func appendSectionLine(b []byte, l *setting.SectionLine) []byte {
	o := open(b)
	o.num("azimuth_deg", roundAzimuth(l.AzimuthDeg, 360), decimalsDeg)
	o.str("azimuth_from", l.From.String())
	o.num("from_km", l.FromKm, decimalsKm)
	o.num("to_km", l.ToKm, decimalsKm)
	o.num("step_km", setting.SectionStepKm, decimalsKm)
	return o.close()
}

func appendTrench(b []byte, t *setting.SectionTrench) []byte {
	o := open(b)
	o.str("id", t.Boundary.ID())
	o.str("name", t.Boundary.Name())
	o.str("type", t.Boundary.Type().String())
	o.key("position")
	o.b = appendPosition(o.b, t.At)
	o.num("position_sigma_km", t.Boundary.SigmaKm(), decimalsSigma)
	o.num("crossing_angle_deg", t.CrossingDeg, decimalsDeg)
	convergence := math.NaN()
	if t.Motion.Known {
		convergence = -t.Motion.OpeningMmYr
	}
	o.num("convergence_mm_yr", convergence, decimalsRate)
	o.key("relative_motion")
	o.b = appendMotion(o.b, &t.Motion)
	return o.close()
}

func appendArc(b []byte, a *setting.ArcBand) []byte {
	if !finite(a.MinDepthKm) {
		return append(b, "null"...)
	}
	o := open(b)
	o.num("min_depth_km", a.MinDepthKm, decimalsDepth)
	o.num("max_depth_km", a.MaxDepthKm, decimalsDepth)
	o.key("ranges")
	o.b = append(o.b, '[')
	for i, r := range a.Ranges {
		if i > 0 {
			o.b = append(o.b, ',')
		}
		x := open(o.b)
		x.num("from_km", r.FromKm, decimalsDepth)
		x.num("to_km", r.ToKm, decimalsDepth)
		o.b = x.close()
	}
	o.b = append(o.b, ']')
	return o.close()
}

func appendSamples(b []byte, s *setting.Section) []byte {
	b = append(b, '[')
	for i := range s.Samples {
		if i > 0 {
			b = append(b, ',')
		}
		p := &s.Samples[i]
		o := open(b)
		o.num("distance_km", p.Km, decimalsKm)
		o.num("lon", roundLon(p.At.Lon, decimalsSite), decimalsSite)
		o.num("lat", p.At.Lat, decimalsSite)
		r := &s.Profiles[0].Readings[i]
		o.num("depth_km", r.DepthKm, decimalsDepth)
		o.num("sigma_km", r.SigmaKm, decimalsSigma)
		o.num("dip_deg", r.DipDeg, decimalsDeg)
		o.key("other_slabs")
		o.b = append(o.b, '[')
		first := true
		for j := range s.Profiles[1:] {
			other := &s.Profiles[1+j]
			if !other.Has(i) {
				continue
			}
			if !first {
				o.b = append(o.b, ',')
			}
			first = false
			x := open(o.b)
			x.str("slab", other.Slab.ID)
			x.num("depth_km", other.Readings[i].DepthKm, decimalsDepth)
			x.num("sigma_km", other.Readings[i].SigmaKm, decimalsSigma)
			x.num("dip_deg", other.Readings[i].DipDeg, decimalsDeg)
			o.b = x.close()
		}
		o.b = append(o.b, ']')
		b = o.close()
	}
	return append(b, ']')
}
