package published

import (
	"io"
	"strconv"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

// Outline is one segment of a .dig file: a title and a curve.
type Outline struct {
	Line  int // of the title
	Title string
	Path  []sphere.LonLat
}

const endOfSegment = "***"

// ReadDig reads .dig text (Bird 2003): for each curve a title line, lines of
// lon,lat, and a line that begins with three asterisks. A curve with a line at
// fault is left out whole: with a vertex missing it would be another curve.
func ReadDig(name string, text io.Reader) ([]Outline, Tally, error) {
	t := Tally{File: name}
	var out []Outline
	var now Outline // Line 0 between segments
	bad := false    // in the segment that now holds
	err := eachLine(name, text, func(line int, s string) {
		lon, lat, isPoint := parsePoint(s)
		switch {
		case strings.HasPrefix(s, endOfSegment):
			switch {
			case now.Line == 0:
				t.reject(line, "an end of a segment, and no segment was open")
			case bad:
			case len(now.Path) < 2:
				t.reject(now.Line, "%q has %d points; a curve has at least 2", now.Title, len(now.Path))
			default:
				out = append(out, now)
				t.Read++
			}
			now, bad = Outline{}, false
		case now.Line == 0 && isPoint:
			t.reject(line, "a point before any title; a title must begin each segment")
			now, bad = Outline{Line: line, Title: "?"}, true
		case now.Line == 0:
			now = Outline{Line: line, Title: strings.TrimSpace(s)}
		case !isPoint:
			t.reject(line, "%.60q is no lon,lat; segment %q, begun in line %d, is left out", s, now.Title, now.Line)
			bad = true
		default:
			p, err := place(lon, lat)
			if err != nil {
				t.reject(line, "%v; segment %q, begun in line %d, is left out", err, now.Title, now.Line)
				bad = true
				return
			}
			if n := len(now.Path); n == 0 || now.Path[n-1] != p {
				now.Path = append(now.Path, p)
			}
		}
	})
	if err == nil && now.Line > 0 && !bad {
		t.reject(now.Line, "segment %q does not end; a line that begins with %s must end it", now.Title, endOfSegment)
	}
	return out, t, err
}

// parsePoint reads "lon,lat".
func parsePoint(s string) (lon, lat float64, ok bool) {
	a, b, found := strings.Cut(s, ",")
	if !found {
		return 0, 0, false
	}
	var errA, errB error
	lon, errA = strconv.ParseFloat(strings.TrimSpace(a), 64)
	lat, errB = strconv.ParseFloat(strings.TrimSpace(b), 64)
	return lon, lat, errA == nil && errB == nil
}

// orogenKinds says how the orogens of Bird (2003) deform, where one word will
// do; the others are mixed. It is the project's reading: the publication names the
// orogens and gives no kind.
var orogenKinds = map[string]setting.ZoneKind{
	"Persia-Tibet-Burma":      setting.CollisionKind,
	"Laptev Sea":              setting.ExtensionKind,
	"Peru":                    setting.CollisionKind,
	"Puna-Sierras Pampeanas":  setting.CollisionKind,
	"Gorda-California-Nevada": setting.ShearKind,
	"western Aleutians":       setting.ShearKind,
}

// Zones makes zones of diffuse deformation of outlines. The name is what stands
// before the first run of blanks of the title, the source what follows it.
func Zones(outlines []Outline, t *Tally) []*setting.Zone {
	var out []*setting.Zone
	for _, o := range outlines {
		name, source := splitTitle(o.Title)
		kind, ok := orogenKinds[name]
		if !ok {
			kind = setting.MixedKind
		}
		ring := o.Path
		if ring[0] != ring[len(ring)-1] {
			ring = append(ring[:len(ring):len(ring)], ring[0])
		}
		z, err := setting.NewZone(setting.Zone{Name: name, Kind: kind, Source: strings.TrimSpace("Bird (2003), orogens; " + source), Rings: [][]sphere.LonLat{ring}})
		if err != nil {
			t.Read--
			t.reject(o.Line, "%v", err)
			continue
		}
		out = append(out, z)
	}
	return out
}

// splitTitle cuts a title at its first run of two blanks.
func splitTitle(title string) (name, remark string) {
	name, remark, _ = strings.Cut(title, "  ")
	return strings.Map(printable, strings.TrimSpace(name)), strings.Map(printable, strings.TrimSpace(remark))
}

// printable drops control characters, which model files do not hold.
func printable(r rune) rune {
	if r < ' ' || r >= 0x7f && r < 0xa0 {
		return -1
	}
	return r
}
