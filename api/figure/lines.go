package figure

import "strings"

// textWidth returns about how wide a text is at a font size, in px. The widths are
// those of a wide sans-serif face, so that most faces stay below.
func textWidth(s string, size float64) float64 {
	em := 0.0
	for _, r := range s {
		switch {
		case strings.ContainsRune("ijl.,:;'|!", r):
			em += 0.33
		case strings.ContainsRune(" ft()[]r-\u00b7", r):
			em += 0.4
		case strings.ContainsRune("mwMW@\u2026", r):
			em += 0.98
		case r >= 'A' && r <= 'Z':
			em += 0.7
		case r > 0x2e80: // East Asian scripts fill the square
			em++
		default:
			em += 0.62
		}
	}
	return em * size
}

// wrap breaks a text into lines no wider than a width in px. A word that is wider
// than a line is broken.
func wrap(s string, size, width float64) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(s) {
		for textWidth(word, size) > width {
			cut := 0
			for i := range word {
				if i > 0 && textWidth(word[:i], size) > width {
					break
				}
				cut = i
			}
			if cut == 0 {
				break // a single character
			}
			if line != "" {
				lines, line = append(lines, line), ""
			}
			lines, word = append(lines, word[:cut]), word[cut:]
		}
		switch {
		case line == "":
			line = word
		case textWidth(line+" "+word, size) <= width:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
