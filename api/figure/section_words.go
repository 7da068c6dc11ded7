package figure

import (
	"fmt"
	"math"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

func (f *sectionFigure) title() string { return "Slab cross-section: " + f.s.Slab.Name }

func (f *sectionFigure) subtitle() string {
	s := f.s
	return fmt.Sprintf("%s; through %s, towards %s", f.platesPhrase(), place(sphere.LonLat{Lon: s.Site.Lon, Lat: s.Site.Lat}), bearing(s.Line.AzimuthDeg))
}

func (f *sectionFigure) platesPhrase() string {
	sl := f.s.Slab
	switch {
	case sl.Subducting == sl.Overriding:
		return "slab within the " + f.plate(sl.Subducting) + " plate"
	case sl.Kind == slab.Collision:
		return fmt.Sprintf("%s plate colliding with the %s plate", f.plate(sl.Subducting), f.plate(sl.Overriding))
	}
	return fmt.Sprintf("%s plate subducting below the %s plate", f.plate(sl.Subducting), f.plate(sl.Overriding))
}

// plate returns a plate's name and code.
func (f *sectionFigure) plate(code string) string {
	for _, p := range f.s.Model.Plates() {
		if p.Code == code {
			return p.Name + " (" + code + ")"
		}
	}
	return code
}

// place writes a position.
func place(p sphere.LonLat) string {
	return fmt.Sprintf("lon %s\u00b0, lat %s\u00b0", trimmed(p.Lon, 4), trimmed(p.Lat, 4))
}

// roughly writes a position with two decimals, about a kilometre.
func roughly(p sphere.LonLat) string {
	return fmt.Sprintf("lon %s\u00b0, lat %s\u00b0", number(p.Lon, 2), number(p.Lat, 2))
}

// trimmed writes a number with one to four decimals, less the zeros at the end.
func trimmed(x float64, decimals int) string {
	return strings.TrimSuffix(strings.TrimRight(number(x, decimals), "0"), ".")
}

var winds = [...]string{"N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW"}

// wind names the nearest of sixteen directions.
func wind(azimuth float64) string {
	return winds[int(math.Round(azimuth/22.5))%len(winds)]
}

// degrees writes an azimuth with three digits.
func degrees(azimuth float64) string {
	return fmt.Sprintf("%03d\u00b0", int(math.Round(azimuth))%360)
}

func bearing(azimuth float64) string { return degrees(azimuth) + " (" + wind(azimuth) + ")" }

// directions says where the line leads at its ends.
func (f *sectionFigure) directions() (up, down string) {
	n := len(f.s.Samples)
	_, a := sphere.Inverse(f.s.Samples[1].At, f.s.Samples[0].At)
	_, b := sphere.Inverse(f.s.Samples[n-2].At, f.s.Samples[n-1].At)
	return "\u2190 " + wind(a) + " " + degrees(a), degrees(b) + " " + wind(b) + " \u2192"
}

func (f *sectionFigure) trenchLabel() string {
	t := &f.s.Trench
	return fmt.Sprintf("%s \u00b1 %s km", t.Boundary.Name(), number(t.Boundary.SigmaKm(), 0))
}

// zero names what distances count from.
func (f *sectionFigure) zero() string {
	switch {
	case !f.s.HasTrench:
		return "slab\u2019s up-dip edge"
	case f.s.Trench.Boundary.Type() == boundary.Subduction:
		return "trench"
	}
	return "plate boundary"
}

// siteLabel says where the site lies to the trench and what is below it.
func (f *sectionFigure) siteLabel() string {
	s := f.s
	text := fmt.Sprintf("site, %s km from the %s", number(math.Abs(s.SiteKm), 0), f.zero())
	if s.SiteKm < 0 && s.HasTrench {
		text += " on the side that goes down"
	}
	return text + "; " + f.belowSite()
}

// shortSiteLabel says what is below the site alone.
func (f *sectionFigure) shortSiteLabel() string { return "site; " + f.belowSite() }

func (f *sectionFigure) belowSite() string {
	if !f.s.IsBelow {
		return "no slab known below it"
	}
	b := &f.s.Below
	return fmt.Sprintf("slab top at %s km, dip %s\u00b0", plusMinus(b.DepthKm, b.SigmaKm), number(b.DipDeg, 0))
}

// plusMinus writes a value with its σ where that is known.
func plusMinus(x, sigma float64) string {
	if math.IsNaN(sigma) {
		return number(x, 0)
	}
	return number(x, 0) + " \u00b1 " + number(sigma, 0)
}

// relation says how a site at depth lies to the slab.
func relation(b *setting.SlabAnswer) string {
	km := number(math.Abs(b.ClearanceKm), 0) + " km "
	switch b.Relation {
	case slab.Above:
		return km + "above the slab\u2019s top"
	case slab.NearInterface:
		return "near the slab\u2019s top"
	case slab.Within:
		return "within the slab, " + km + "below its top"
	case slab.Below:
		return km + "below the slab\u2019s top"
	}
	return ""
}

// scaleText states the scale.
func (f *sectionFigure) scaleText() string {
	if f.exaggeration == 1 {
		return "True scale: one kilometre is as long down as along."
	}
	return fmt.Sprintf("Vertical exaggeration \u00d7%g: dips look steeper than they are.", f.exaggeration)
}

// caption returns the paragraphs below the figure.
func (f *sectionFigure) caption() (out []string) {
	s := f.s
	last := s.Samples[len(s.Samples)-1]
	out = append(out, fmt.Sprintf("Slab: %s.", strings.TrimSuffix(s.Slab.Source, ".")))
	out = append(out, fmt.Sprintf("%s The line is the WGS84 geodesic from %s to %s, %s; the slab is read every %d km.",
		f.scaleText(), roughly(s.Samples[0].At), roughly(last.At), f.lineFrom(), setting.SectionStepKm))
	if s.HasTrench {
		out = append(out, f.motionText())
	} else {
		out = append(out, "The line meets no trench of this slab in the model: distances count from the slab\u2019s up-dip edge.")
	}
	model := s.Model
	out = append(out, fmt.Sprintf("Model: %s, %s (SHA-256 %.12s\u2026, %s).", model.Ref(), strings.TrimSuffix(model.Title(), "."), model.SHA256(), model.Licence()))
	for _, n := range s.Notes.All() {
		if n.Code == setting.NoteScreening {
			out = append(out, n.Text())
		}
	}
	return out
}

// lineFrom says what gave the line its direction.
func (f *sectionFigure) lineFrom() string {
	if f.s.Line.From == setting.FromTrench {
		return "in the direction from the trench to the site, since the line down the local dip does not meet the trench squarely"
	}
	return "down the dip at the site"
}

// motionText tells the motion at the trench.
func (f *sectionFigure) motionText() string {
	m := &f.s.Trench.Motion
	name := f.s.Trench.Boundary.Name()
	if !m.Known {
		return fmt.Sprintf("Motion at the %s: not known, motion model %s lacks one of the plates.", name, f.s.MotionModel)
	}
	text := fmt.Sprintf("Motion at the %s: %s moves at ", name, f.plate(m.Plate))
	rate := number(m.RateMmYr, 1)
	if !math.IsNaN(m.RateSigmaMmYr) {
		rate += " \u00b1 " + number(m.RateSigmaMmYr, 1)
	}
	text += rate + " mm/yr"
	if !math.IsNaN(m.AzimuthDeg) {
		text += " towards " + bearing(m.AzimuthDeg)
	}
	text += " as seen from " + f.plate(m.RelativeTo)
	square := "convergence"
	if m.OpeningMmYr > 0 {
		square = "opening"
	}
	text += fmt.Sprintf("; %s square to it %s mm/yr", square, number(math.Abs(m.OpeningMmYr), 1))
	if !math.IsNaN(m.ObliquityDeg) {
		text += fmt.Sprintf(", obliquity %s\u00b0", number(m.ObliquityDeg, 0))
	}
	text += ". Motion model " + m.Model
	if mm, ok := f.s.Model.Motion(m.Model); ok {
		text += ": " + strings.TrimSuffix(mm.Info().Citation, ".")
	}
	return text + "."
}

// description tells what the figure shows to who cannot see it.
func (f *sectionFigure) description() string {
	s := f.s
	var b strings.Builder
	fmt.Fprintf(&b, "Depth of the slab\u2019s top against distance, %s. %s. ", f.subtitle(), capital(f.siteLabel()))
	for _, r := range s.Arc.Ranges {
		fmt.Fprintf(&b, "Arc band from %s to %s km. ", number(r.FromKm, 0), number(r.ToKm, 0))
	}
	for i := range s.Profiles {
		f.runs(i, func(from, to int) {
			r := s.Profiles[i].Readings
			fmt.Fprintf(&b, "%s: from %s km depth at %s km to %s km depth at %s km. ", s.Profiles[i].Slab.Name,
				number(r[from].DepthKm, 0), number(s.Samples[from].Km, 0), number(r[to].DepthKm, 0), number(s.Samples[to].Km, 0))
		})
	}
	return b.String() + f.scaleText()
}

func capital(s string) string { return strings.ToUpper(s[:1]) + s[1:] }
