package wire

import (
	"nearmargin/setting"
)

// Decimals of the quantities of an area.
const (
	decimalsArea     = 6 // km²: a square metre
	decimalsFraction = 5
)

// AppendArea appends the answer for an area as one JSON object. All keys are
// always present.
func AppendArea(b []byte, a *setting.AreaAnswer) []byte {
	o := open(b)
	o.num("area_km2", a.AreaKm2, decimalsArea)
	o.key("plates")
	o.b = appendList(o.b, a.Plates, func(p *object, s *setting.PlateShare) {
		p.str("code", s.Plate.Code)
		p.str("name", s.Plate.Name)
		p.num("fraction", s.Fraction, decimalsFraction)
	})
	o.key("settings")
	o.b = appendList(o.b, a.Settings, func(p *object, s *setting.SettingShare) {
		p.str("label", s.Label.String())
		p.str("family", s.Family.String())
		p.num("fraction", s.Fraction, decimalsFraction)
	})
	o.key("boundaries_inside")
	o.b = appendList(o.b, a.Boundaries, appendInside)
	o.key("nearest_boundary")
	o.b = appendBoundary(o.b, &a.Nearest)
	o.key("slabs")
	o.b = appendList(o.b, a.Slabs, func(p *object, s *setting.SlabShare) {
		p.str("slab", s.Slab.ID)
		p.str("name", s.Slab.Name)
		p.str("kind", s.Slab.Kind.String())
		p.num("fraction", s.Fraction, decimalsFraction)
		p.num("min_depth_km", s.MinDepthKm, decimalsKm)
		p.num("median_depth_km", s.MedianDepthKm, decimalsKm)
		p.num("max_depth_km", s.MaxDepthKm, decimalsKm)
	})
	o.key("sampling")
	o.b = appendSampling(o.b, &a.Sampling)
	o.foot(a.Model, a.Notes.All())
	return o.close()
}

// appendList appends an array of objects, whose members f writes.
func appendList[T any](b []byte, list []T, f func(*object, *T)) []byte {
	b = append(b, '[')
	for i := range list {
		if i > 0 {
			b = append(b, ',')
		}
		o := open(b)
		f(&o, &list[i])
		b = o.close()
	}
	return append(b, ']')
}

func appendInside(p *object, x *setting.BoundaryInside) {
	p.str("id", x.Boundary.ID())
	p.str("name", x.Boundary.Name())
	p.str("type", x.Boundary.Type().String())
	p.str("left_plate", x.Boundary.Left())
	p.str("right_plate", x.Boundary.Right())
	p.strOrNull("subducting_plate", x.Boundary.Subducting())
	p.num("length_km", x.LengthKm, decimalsKm)
	p.key("relative_motion")
	p.b = appendMotionRange(p.b, &x.Motion)
}

func appendMotionRange(b []byte, m *setting.MotionRange) []byte {
	if !m.Known {
		return append(b, "null"...)
	}
	o := open(b)
	o.str("plate", m.Plate)
	o.str("relative_to", m.RelativeTo)
	o.span("rate_mm_yr", "min", "max", m.RateMmYr, decimalsRate)
	o.span("rate_sigma_mm_yr", "min", "max", m.RateSigmaMmYr, decimalsRate)
	az := setting.Range{Min: roundAzimuth(m.AzimuthDeg.Min, 360), Max: roundAzimuth(m.AzimuthDeg.Max, 360)}
	o.span("azimuth_deg", "from", "to", az, decimalsDeg)
	o.span("opening_mm_yr", "min", "max", m.OpeningMmYr, decimalsRate)
	o.span("shear_mm_yr", "min", "max", m.ShearMmYr, decimalsRate)
	o.span("obliquity_deg", "min", "max", m.ObliquityDeg, decimalsDeg)
	o.str("motion_model", m.Model)
	return o.close()
}

// span writes a range as an object of two numbers; null where there is none.
func (o *object) span(k, low, high string, r setting.Range, decimals int) {
	if !finite(r.Min) || !finite(r.Max) {
		o.null(k)
		return
	}
	o.key(k)
	p := open(o.b)
	p.num(low, r.Min, decimals)
	p.num(high, r.Max, decimals)
	o.b = p.close()
}

func appendSampling(b []byte, s *setting.Sampling) []byte {
	o := open(b)
	o.num("points", float64(s.Points), 0)
	o.num("spacing_km", s.SpacingKm, 3)
	o.num("standard_error", s.StandardError, decimalsFraction)
	o.num("plate_points", float64(s.PlatePoints), 0)
	o.num("plate_spacing_km", s.PlateSpacingKm, 3)
	o.num("plate_standard_error", s.PlateStandardError, decimalsFraction)
	return o.close()
}
