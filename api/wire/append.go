package wire

import (
	"math"
	"strconv"
	"unicode/utf8"
)

// Decimals of each kind of quantity.
const (
	decimalsKm       = 2
	decimalsSigma    = 1
	decimalsDepth    = 1
	decimalsDeg      = 1
	decimalsRate     = 2
	decimalsPosition = 4
	decimalsSite     = 6
)

var pow10 = [...]float64{1, 10, 100, 1e3, 1e4, 1e5, 1e6}

// appendRounded appends a number with no more than the decimals given and no
// trailing zeros; nothing for one that is not finite.
func appendRounded(b []byte, x float64, decimals int) []byte {
	if !finite(x) {
		return b
	}
	return strconv.AppendFloat(b, rounded(x, decimals), 'f', -1, 64)
}

func finite(x float64) bool { return x-x == 0 }

// rounded rounds to a number of decimals; never to minus zero.
func rounded(x float64, decimals int) float64 {
	return math.Round(x*pow10[decimals])/pow10[decimals] + 0
}

// roundLon rounds a longitude within (-180, 180] so that it stays there.
func roundLon(deg float64, decimals int) float64 {
	if x := rounded(deg, decimals); x > -180 {
		return x
	}
	return 180
}

// roundAzimuth rounds an azimuth so that it stays below 360.
func roundAzimuth(deg float64, below float64) float64 {
	x := math.Round(deg*pow10[decimalsDeg]) / pow10[decimalsDeg]
	if x >= below {
		return 0
	}
	return x
}

// object appends the members of a JSON object.
type object struct {
	b     []byte
	first bool
}

func open(b []byte) object { return object{append(b, '{'), true} }

func (o *object) key(k string) {
	if !o.first {
		o.b = append(o.b, ',')
	}
	o.first = false
	o.b = append(o.b, '"')
	o.b = append(o.b, k...)
	o.b = append(o.b, '"', ':')
}

func (o *object) str(k, v string) {
	o.key(k)
	o.b = AppendString(o.b, v)
}

// strOrNull writes null for "".
func (o *object) strOrNull(k, v string) {
	o.key(k)
	if v == "" {
		o.b = append(o.b, "null"...)
		return
	}
	o.b = AppendString(o.b, v)
}

func (o *object) null(k string) {
	o.key(k)
	o.b = append(o.b, "null"...)
}

func (o *object) boolean(k string, v bool) {
	o.key(k)
	o.b = strconv.AppendBool(o.b, v)
}

// num writes null for a number that is not finite.
func (o *object) num(k string, x float64, decimals int) {
	o.key(k)
	if !finite(x) {
		o.b = append(o.b, "null"...)
		return
	}
	o.b = appendRounded(o.b, x, decimals)
}

func (o *object) close() []byte { return append(o.b, '}') }

const hexDigits = "0123456789abcdef"

// AppendString appends a JSON string. Bytes that are not UTF-8 become U+FFFD, as
// encoding/json has it.
func AppendString(b []byte, s string) []byte {
	b = append(b, '"')
	start := 0
	for i := 0; i < len(s); {
		c := s[i]
		if c < utf8.RuneSelf {
			if c >= ' ' && c != '"' && c != '\\' {
				i++
				continue
			}
			b = append(b, s[start:i]...)
			switch c {
			case '"', '\\':
				b = append(b, '\\', c)
			case '\n':
				b = append(b, '\\', 'n')
			case '\r':
				b = append(b, '\\', 'r')
			case '\t':
				b = append(b, '\\', 't')
			default:
				b = append(b, '\\', 'u', '0', '0', hexDigits[c>>4], hexDigits[c&15])
			}
			i++
			start = i
			continue
		}
		r, size := utf8.DecodeRuneInString(s[i:])
		if r == utf8.RuneError && size == 1 {
			b = append(b, s[start:i]...)
			b = append(b, `\ufffd`...)
			i++
			start = i
			continue
		}
		i += size
	}
	b = append(b, s[start:]...)
	return append(b, '"')
}
