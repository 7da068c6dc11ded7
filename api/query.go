package api

import (
	"fmt"
	"math"
	"net/url"
	"slices"
	"strconv"
	"strings"
)

// query reads the parameters of a request strictly: each at most once, none that
// is not known, numbers in decimal notation. It collects every fault.
type query struct {
	values url.Values
	faults []FieldFault
}

// newQuery parses a raw query. The names are the parameters that the path takes.
func newQuery(raw string, names ...string) *query {
	q := &query{}
	var err error
	if q.values, err = url.ParseQuery(raw); err != nil {
		q.fault("", "the query cannot be read: %v", err)
	}
	for _, name := range sortedKeys(q.values) {
		switch {
		case !slices.Contains(names, name):
			q.fault(name, "is not a parameter of this path; it takes %s", strings.Join(names, ", "))
		case len(q.values[name]) > 1:
			q.fault(name, "is given %d times; give it once", len(q.values[name]))
		}
	}
	return q
}

func sortedKeys(v url.Values) []string {
	var keys []string
	for k := range v {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

func (q *query) fault(parameter, format string, args ...any) {
	if parameter == "" {
		parameter = "query"
	}
	const most = 60
	if len(parameter) > most {
		parameter = parameter[:most] + "..."
	}
	q.faults = append(q.faults, FieldFault{Parameter: strings.ToValidUTF8(parameter, "\uFFFD"), Detail: fmt.Sprintf(format, args...)})
}

// err returns the problem for all faults met, nil where there is none.
func (q *query) err() error {
	if len(q.faults) == 0 {
		return nil
	}
	return badRequest(q.faults...)
}

// text returns a parameter, "" where it is absent.
func (q *query) text(name string) string { return q.values.Get(name) }

// isDecimal reports whether a text is a number in decimal notation: a sign or
// none, digits with a point or without, at least one of them, and an exponent of
// at most three digits or none.
func isDecimal(s string) bool {
	digits := func(most int) int {
		n := 0
		for n < len(s) && n < most && s[n] >= '0' && s[n] <= '9' {
			n++
		}
		s = s[n:]
		return n
	}
	skip := func(set string) bool {
		if s == "" || strings.IndexByte(set, s[0]) < 0 {
			return false
		}
		s = s[1:]
		return true
	}
	skip("+-")
	n := digits(len(s))
	if skip(".") {
		n += digits(len(s))
	}
	if n == 0 {
		return false
	}
	if skip("eE") {
		skip("+-")
		if digits(3) == 0 {
			return false
		}
	}
	return s == ""
}

// number returns a parameter's number, NaN where it is absent.
func (q *query) number(name string, required bool) float64 {
	if !q.values.Has(name) {
		if required {
			q.fault(name, "is missing; give a number, such as %s=12.5", name)
		}
		return math.NaN()
	}
	s := q.text(name)
	x, err := parseDecimal(s)
	if err != nil {
		q.fault(name, "%v", err)
		return math.NaN()
	}
	return x
}

// parseDecimal reads a finite number in decimal notation.
func parseDecimal(s string) (float64, error) {
	const most = 40
	shown := s
	if len(shown) > most {
		shown = shown[:most] + "..."
	}
	if !isDecimal(s) {
		if strings.Contains(s, ",") {
			return 0, fmt.Errorf("%q is not a number; write a decimal point", shown)
		}
		return 0, fmt.Errorf("%q is not a number in decimal notation, such as -72.4", shown)
	}
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return 0, fmt.Errorf("%q is beyond the range of numbers", shown)
	}
	return x, nil
}
