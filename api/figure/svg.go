package figure

import (
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
)

// canvas builds an SVG document.
type canvas struct {
	b    []byte
	open []string
}

// attrs are names and values of attributes, in turn.
type attrs []string

// start opens an element.
func (c *canvas) start(name string, a attrs) {
	c.tag(name, a)
	c.b = append(c.b, ">\n"...)
	c.open = append(c.open, name)
}

// end closes the element opened last.
func (c *canvas) end() {
	last := len(c.open) - 1
	c.b = append(c.b, "</"+c.open[last]+">\n"...)
	c.open = c.open[:last]
}

// leaf writes an element without content.
func (c *canvas) leaf(name string, a attrs) {
	c.tag(name, a)
	c.b = append(c.b, "/>\n"...)
}

// content writes an element whose content is text.
func (c *canvas) content(name, text string, a attrs) {
	c.tag(name, a)
	c.b = append(c.b, '>')
	c.b = appendEscaped(c.b, text)
	c.b = append(c.b, "</"+name+">\n"...)
}

func (c *canvas) tag(name string, a attrs) {
	for range c.open {
		c.b = append(c.b, ' ')
	}
	c.b = append(c.b, "<"+name...)
	for i := 0; i+1 < len(a); i += 2 {
		c.b = append(c.b, " "+a[i]+`="`...)
		c.b = appendEscaped(c.b, a[i+1])
		c.b = append(c.b, '"')
	}
}

// appendEscaped appends text so that it is safe as content and between double
// quotes. Bytes that are not UTF-8 and characters that XML 1.0 does not allow
// become U+FFFD.
func appendEscaped(b []byte, s string) []byte {
	for _, r := range s {
		switch {
		case r == '&':
			b = append(b, "&amp;"...)
		case r == '<':
			b = append(b, "&lt;"...)
		case r == '>':
			b = append(b, "&gt;"...)
		case r == '"':
			b = append(b, "&quot;"...)
		case r == '\n' || r == '\t' || r == '\r':
			b = append(b, ' ')
		case r < ' ' || r == 0xFFFE || r == 0xFFFF:
			b = utf8.AppendRune(b, utf8.RuneError)
		default:
			b = utf8.AppendRune(b, r) // a bad byte has become U+FFFD already
		}
	}
	return b
}

// px writes a length in pixels with one decimal.
func px(x float64) string {
	return strconv.FormatFloat(math.Round(x*10)/10+0, 'f', -1, 64)
}

// point is a place on the figure in px.
type point struct{ x, y float64 }

// pathOf returns path data through points, closed or not.
func pathOf(pts []point, closed bool) string {
	var b strings.Builder
	for i, p := range pts {
		b.WriteByte("ML"[min(i, 1)])
		b.WriteString(px(p.x))
		b.WriteByte(' ')
		b.WriteString(px(p.y))
	}
	if closed {
		b.WriteByte('Z')
	}
	return b.String()
}

// number writes a number for the reader: a true minus sign, no minus zero.
func number(x float64, decimals int) string {
	p := math.Pow(10, float64(decimals))
	return strings.Replace(strconv.FormatFloat(math.Round(x*p)/p+0, 'f', decimals, 64), "-", "\u2212", 1)
}
