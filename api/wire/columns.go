package wire

import (
	"nearmargin/setting"
)

// Columns are the names of the columns that a table gains, without prefix.
var Columns = [...]string{
	"plate", "side_uncertain", "setting", "family", "confidence", "reason",
	"boundary_id", "boundary_type", "distance_km", "distance_sigma_km", "azimuth_deg",
	"rate_mm_yr", "rate_sigma_mm_yr", "rate_azimuth_deg", "opening_mm_yr", "shear_mm_yr",
	"obliquity_deg", "motion_model", "control_id", "control_type", "control_distance_km",
	"slab", "slab_depth_km", "slab_sigma_km", "slab_dip_deg", "site_relation", "clearance_km",
	"diffuse_zone", "hotspot", "model", "notes", "error",
}

// NumColumns is their number.
const NumColumns = len(Columns)

// The places of the columns.
const (
	colPlate = iota
	colSideUncertain
	colSetting
	colFamily
	colConfidence
	colReason
	colBoundaryID
	colBoundaryType
	colDistance
	colDistanceSigma
	colAzimuth
	colRate
	colRateSigma
	colRateAzimuth
	colOpening
	colShear
	colObliquity
	colMotionModel
	colControlID
	colControlType
	colControlDistance
	colSlab
	colSlabDepth
	colSlabSigma
	colSlabDip
	colSiteRelation
	colClearance
	colDiffuseZone
	colHotspot
	colModel
	colNotes
	colError
)

// Cells holds the values of the added columns for one row. The values lie end to
// end in one buffer that is used again for the next row.
type Cells struct {
	buf  []byte
	ends [NumColumns]int
}

// Value returns the value of column i. It is valid until the next Set.
func (c *Cells) Value(i int) []byte {
	if i == 0 {
		return c.buf[:c.ends[0]]
	}
	return c.buf[c.ends[i-1]:c.ends[i]]
}

// SetError leaves all columns empty but the last, which says why.
func (c *Cells) SetError(reason string) {
	c.buf = append(c.buf[:0], reason...)
	c.ends = [NumColumns]int{}
	c.ends[colError] = len(c.buf)
}

// Set fills the columns from an answer.
func (c *Cells) Set(a *setting.Answer) {
	b := c.buf[:0]
	n := &a.Nearest
	for i := range Columns {
		switch i {
		case colPlate:
			b = append(b, a.Plate.Code...)
		case colSideUncertain:
			b = appendBool(b, a.SideUncertain)
		case colSetting:
			b = append(b, a.Label.String()...)
		case colFamily:
			b = append(b, a.Family.String()...)
		case colConfidence:
			b = append(b, a.Confidence.String()...)
		case colReason:
			b = a.Reasons.All()[0].AppendText(b)
		case colBoundaryID:
			b = append(b, n.Boundary.ID()...)
		case colBoundaryType:
			b = append(b, n.Boundary.Type().String()...)
		case colDistance:
			b = appendRounded(b, n.DistanceKm, decimalsKm)
		case colDistanceSigma:
			b = appendRounded(b, n.SigmaKm, decimalsSigma)
		case colAzimuth:
			b = appendRounded(b, roundAzimuth(n.AzimuthDeg, 360), decimalsDeg)
		case colRate, colRateSigma, colRateAzimuth, colOpening, colShear, colObliquity, colMotionModel:
			b = appendMotionCell(b, i, &n.Motion)
		case colControlID, colControlType, colControlDistance:
			b = appendControlCell(b, i, a)
		case colSlab, colSlabDepth, colSlabSigma, colSlabDip, colSiteRelation, colClearance:
			if a.Slabs.Len() > 0 {
				b = appendSlabCell(b, i, &a.Slabs.All()[0])
			}
		case colDiffuseZone:
			if a.Zone != nil {
				b = append(b, a.Zone.Name...)
			}
		case colHotspot:
			if a.Hotspot != nil {
				b = append(b, a.Hotspot.Name...)
			}
		case colModel:
			b = append(b, a.Model.ID()...)
			b = append(b, '@')
			b = append(b, a.Model.Edition()...)
		case colNotes:
			for j, note := range a.Notes.All() {
				if j > 0 {
					b = append(b, ';')
				}
				b = append(b, note.Code...)
			}
		}
		c.ends[i] = len(b)
	}
	c.buf = b
}

func appendBool(b []byte, v bool) []byte {
	if v {
		return append(b, "true"...)
	}
	return append(b, "false"...)
}

func appendMotionCell(b []byte, col int, m *setting.Motion) []byte {
	if !m.Known {
		return b
	}
	switch col {
	case colRate:
		return appendRounded(b, m.RateMmYr, decimalsRate)
	case colRateSigma:
		return appendRounded(b, m.RateSigmaMmYr, decimalsRate)
	case colRateAzimuth:
		return appendRounded(b, roundAzimuth(m.AzimuthDeg, 360), decimalsDeg)
	case colOpening:
		return appendRounded(b, m.OpeningMmYr, decimalsRate)
	case colShear:
		return appendRounded(b, m.ShearMmYr, decimalsRate)
	case colObliquity:
		return appendRounded(b, m.ObliquityDeg, decimalsDeg)
	}
	return append(b, m.Model...)
}

func appendControlCell(b []byte, col int, a *setting.Answer) []byte {
	if !a.IsControlled {
		return b
	}
	switch col {
	case colControlID:
		return append(b, a.Controlling.Boundary.ID()...)
	case colControlType:
		return append(b, a.Controlling.Boundary.Type().String()...)
	}
	return appendRounded(b, a.Controlling.DistanceKm, decimalsKm)
}

func appendSlabCell(b []byte, col int, s *setting.SlabAnswer) []byte {
	switch col {
	case colSlab:
		return append(b, s.Slab.ID...)
	case colSlabDepth:
		return appendRounded(b, s.DepthKm, decimalsDepth)
	case colSlabSigma:
		return appendRounded(b, s.SigmaKm, decimalsSigma)
	case colSlabDip:
		return appendRounded(b, s.DipDeg, decimalsDeg)
	case colSiteRelation:
		return append(b, relation(s.Relation)...)
	}
	return appendRounded(b, s.ClearanceKm, decimalsDepth)
}
