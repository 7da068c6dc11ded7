package wire

import (
	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// AppendAnswer appends the answer as one JSON object. All keys are always
// present.
func AppendAnswer(b []byte, a *setting.Answer) []byte {
	o := open(b)
	o.key("site")
	o.b = appendSite(o.b, &a.Site)
	o.key("plate")
	p := open(o.b)
	p.str("code", a.Plate.Code)
	p.str("name", a.Plate.Name)
	p.boolean("side_uncertain", a.SideUncertain)
	o.b = p.close()
	o.key("setting")
	o.b = appendSetting(o.b, a)
	o.key("nearest_boundary")
	o.b = appendBoundary(o.b, &a.Nearest)
	o.key("controlling_boundary")
	if a.IsControlled {
		o.b = appendBoundary(o.b, &a.Controlling)
	} else {
		o.b = append(o.b, "null"...)
	}
	o.key("nearby_boundaries")
	o.b = appendNearby(o.b, a.Nearby.All())
	o.key("slabs")
	o.b = appendSlabs(o.b, a.Slabs.All())
	o.key("triple_junction")
	o.b = appendJunction(o.b, a)
	o.key("diffuse_zone")
	if a.Zone != nil {
		z := open(o.b)
		z.str("name", a.Zone.Name)
		z.str("kind", a.Zone.Kind.String())
		o.b = z.close()
	} else {
		o.b = append(o.b, "null"...)
	}
	o.key("hotspot")
	if a.Hotspot != nil {
		h := open(o.b)
		h.str("name", a.Hotspot.Name)
		h.num("distance_km", a.HotspotKm, decimalsKm)
		o.b = h.close()
	} else {
		o.b = append(o.b, "null"...)
	}
	o.foot(a.Model, a.Notes.All())
	return o.close()
}

func appendSite(b []byte, s *setting.Site) []byte {
	o := open(b)
	o.num("lon", roundLon(s.Lon, decimalsSite), decimalsSite)
	o.num("lat", s.Lat, decimalsSite)
	o.num("depth_km", s.DepthKm, 3)
	o.num("uncertainty_km", s.UncertaintyKm, 3)
	return o.close()
}

func appendSetting(b []byte, a *setting.Answer) []byte {
	o := open(b)
	o.str("label", a.Label.String())
	o.str("family", a.Family.String())
	o.str("confidence", a.Confidence.String())
	o.key("reasons")
	o.b = append(o.b, '[')
	for i := range a.Reasons.All() {
		if i > 0 {
			o.b = append(o.b, ',')
		}
		o.b = AppendString(o.b, a.Reasons.All()[i].Text())
	}
	o.b = append(o.b, ']')
	o.key("alternatives")
	o.b = append(o.b, '[')
	for i := range a.Alternatives.All() {
		alt := &a.Alternatives.All()[i]
		if i > 0 {
			o.b = append(o.b, ',')
		}
		c := open(o.b)
		c.str("label", alt.Label.String())
		c.str("family", alt.Family.String())
		c.str("reason", alt.Text())
		o.b = c.close()
	}
	o.b = append(o.b, ']')
	return o.close()
}

func appendBoundary(b []byte, x *setting.BoundaryAnswer) []byte {
	bd := x.Boundary
	o := open(b)
	o.str("id", bd.ID())
	o.str("name", bd.Name())
	o.str("type", bd.Type().String())
	o.num("distance_km", x.DistanceKm, decimalsKm)
	o.num("distance_sigma_km", x.SigmaKm, decimalsSigma)
	o.num("azimuth_deg", roundAzimuth(x.AzimuthDeg, 360), decimalsDeg)
	o.key("nearest_point")
	o.b = appendPosition(o.b, x.Nearest)
	o.num("boundary_azimuth_deg", roundAzimuth(x.BoundaryAzimuthDeg(), 180), decimalsDeg)
	o.str("left_plate", bd.Left())
	o.str("right_plate", bd.Right())
	o.strOrNull("subducting_plate", bd.Subducting())
	o.key("relative_motion")
	o.b = appendMotion(o.b, &x.Motion)
	return o.close()
}

func appendPosition(b []byte, p sphere.LonLat) []byte {
	b = append(b, '[')
	b = appendRounded(b, roundLon(p.Lon, decimalsPosition), decimalsPosition)
	b = append(b, ',')
	b = appendRounded(b, p.Lat, decimalsPosition)
	return append(b, ']')
}

func appendMotion(b []byte, m *setting.Motion) []byte {
	if !m.Known {
		return append(b, "null"...)
	}
	o := open(b)
	o.str("plate", m.Plate)
	o.str("relative_to", m.RelativeTo)
	o.num("rate_mm_yr", m.RateMmYr, decimalsRate)
	o.num("rate_sigma_mm_yr", m.RateSigmaMmYr, decimalsRate)
	o.num("azimuth_deg", roundAzimuth(m.AzimuthDeg, 360), decimalsDeg)
	o.num("azimuth_sigma_deg", m.AzimuthSigmaDeg, decimalsDeg)
	o.num("opening_mm_yr", m.OpeningMmYr, decimalsRate)
	o.num("shear_mm_yr", m.ShearMmYr, decimalsRate)
	o.num("obliquity_deg", m.ObliquityDeg, decimalsDeg)
	o.str("motion_model", m.Model)
	return o.close()
}

func appendNearby(b []byte, list []setting.Nearby) []byte {
	b = append(b, '[')
	for i, n := range list {
		if i > 0 {
			b = append(b, ',')
		}
		o := open(b)
		o.str("id", n.Boundary.ID())
		o.str("name", n.Boundary.Name())
		o.str("type", n.Boundary.Type().String())
		o.num("distance_km", n.DistanceKm, decimalsKm)
		o.num("azimuth_deg", roundAzimuth(n.AzimuthDeg, 360), decimalsDeg)
		b = o.close()
	}
	return append(b, ']')
}

func appendSlabs(b []byte, list []setting.SlabAnswer) []byte {
	b = append(b, '[')
	for i := range list {
		x := &list[i]
		if i > 0 {
			b = append(b, ',')
		}
		o := open(b)
		o.str("slab", x.Slab.ID)
		o.str("name", x.Slab.Name)
		o.str("kind", x.Slab.Kind.String())
		o.num("depth_km", x.DepthKm, decimalsDepth)
		o.num("sigma_km", x.SigmaKm, decimalsSigma)
		o.num("dip_deg", x.DipDeg, decimalsDeg)
		o.num("dip_azimuth_deg", roundAzimuth(x.DipAzimuthDeg, 360), decimalsDeg)
		o.strOrNull("site_relation", relation(x.Relation))
		o.num("clearance_km", x.ClearanceKm, decimalsDepth)
		o.num("distance_3d_km", x.Distance3DKm, decimalsDepth)
		b = o.close()
	}
	return append(b, ']')
}

// relation returns the word for a relation, "" for none.
func relation(r slab.Relation) string {
	if r == slab.NoRelation {
		return ""
	}
	return r.String()
}

func appendJunction(b []byte, a *setting.Answer) []byte {
	if !a.NearJunction {
		return append(b, "null"...)
	}
	o := open(b)
	o.str("name", a.Junction.Junction.Name)
	o.key("plates")
	o.b = append(o.b, '[')
	for i, code := range a.Junction.Junction.Plates {
		if i > 0 {
			o.b = append(o.b, ',')
		}
		o.b = AppendString(o.b, code)
	}
	o.b = append(o.b, ']')
	o.num("distance_km", a.Junction.DistanceKm, decimalsKm)
	return o.close()
}
