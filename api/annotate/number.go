package annotate

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
)

// errMissing stands for a value that is not there.
var errMissing = errors.New("is missing")

// isMissing reports whether a cell stands for "no value". NA is a missing
// coordinate; that it is a plate's code as well does no harm here, since codes
// of plates are never read.
func isMissing(s string) bool {
	switch len(s) {
	case 0:
		return true
	case 1:
		return s == "-"
	}
	switch strings.ToLower(s) {
	case "na", "n/a", "nan", "null", "none", "nil", "-999", "-999.0", "-999.25", "-9999", "-9999.0", "-99999":
		return true
	}
	return false
}

// parseNumber reads a number as people write it in tables. comma allows a
// decimal comma. The error is errMissing, or says what is wrong.
func parseNumber(s string, comma bool) (float64, error) {
	s = strings.TrimSpace(s)
	if isMissing(s) {
		return math.NaN(), errMissing
	}
	if comma && strings.IndexByte(s, ',') >= 0 && strings.IndexByte(s, '.') < 0 && strings.Count(s, ",") == 1 {
		s = strings.Replace(s, ",", ".", 1)
	}
	for i := range len(s) {
		if c := s[i]; (c < '0' || c > '9') && c != '+' && c != '-' && c != '.' && c != 'e' && c != 'E' {
			return math.NaN(), fmt.Errorf("%q is not a number; give decimal degrees or km with a decimal point%s", clip(s), hint(s))
		}
	}
	x, err := strconv.ParseFloat(s, 64)
	if err != nil || math.IsInf(x, 0) {
		return math.NaN(), fmt.Errorf("%q is not a number that can be read", clip(s))
	}
	return x, nil
}

// hint says what a value that is no plain number looks like.
func hint(s string) string {
	switch {
	case strings.ContainsAny(s, "°'\"′″") || strings.ContainsAny(s, "NSEWnsew"):
		return ", such as -33.45 for 33°27'S"
	case strings.Contains(s, ","):
		return "; a decimal comma is read only where the separator is a semicolon or a tab"
	}
	return ""
}

// clip shortens a value for an error message.
func clip(s string) string {
	const most = 40
	if len(s) <= most {
		return strings.ToValidUTF8(s, "\uFFFD")
	}
	return strings.ToValidUTF8(s[:most], "\uFFFD") + "..."
}

// Names under which coordinates are found, with or without a unit.
var (
	lonName = regexp.MustCompile(`(?i)^\s*(lon|long|longitude)` + unitTail)
	latName = regexp.MustCompile(`(?i)^\s*(lat|latitude)` + unitTail)
)

const unitTail = `(\s*[ _(\[]\s*(deg|degrees?|dd|decimal[ _]degrees?|°|wgs ?84)\s*[)\]]?)?\s*$`

// findColumn returns the place of the column that is named, or else of the only
// one whose name fits.
func findColumn(names []string, given, parameter, what string, fits *regexp.Regexp) (int, error) {
	at := -1
	for i, n := range names {
		if given != "" && n != given || given == "" && !fits.MatchString(n) {
			continue
		}
		if at >= 0 {
			return -1, &InputError{Line: 1, Parameter: parameter, Detail: fmt.Sprintf("columns %d (%s) and %d (%s) could both be the %s; choose with %s, or rename one", at+1, clip(names[at]), i+1, clip(n), what, parameter)}
		}
		at = i
	}
	if at >= 0 {
		return at, nil
	}
	if given != "" {
		return -1, &InputError{Line: 1, Parameter: parameter, Detail: fmt.Sprintf("there is no column %q; the columns are %s", clip(given), listNames(names))}
	}
	return -1, &InputError{Line: 1, Parameter: parameter, Detail: fmt.Sprintf("no column for %s; the columns are %s. Name it with %s", what, listNames(names), parameter)}
}

// listNames lists column names, not too many.
func listNames(names []string) string {
	const most = 30
	var b strings.Builder
	for i, n := range names {
		if i == most {
			fmt.Fprintf(&b, " and %d more", len(names)-most)
			break
		}
		if i > 0 {
			b.WriteString(", ")
		}
		b.WriteString(clip(n))
	}
	return b.String()
}
