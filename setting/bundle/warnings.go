package bundle

import (
	"regexp"

	"nearmargin/setting"
)

const warningsFile = "warnings.csv"

var (
	warningsColumns = []string{"code", "lon", "lat", "detail"}
	warningCodeForm = regexp.MustCompile(`^[a-z]+(_[a-z]+)*$`)
)

// readWarnings reads warnings.csv; a fault without a place leaves lon and lat
// empty.
func readWarnings(raw []byte) ([]setting.Warning, error) {
	t, err := readTable(warningsFile, raw, warningsColumns)
	if err != nil {
		return nil, err
	}
	var out []setting.Warning
	for i := range t.rows {
		w := setting.Warning{Code: t.cell(i, "code"), Detail: t.cell(i, "detail")}
		if !warningCodeForm.MatchString(w.Code) {
			return nil, t.fault(i, "code %q must be lower-case words joined by underscores", w.Code)
		}
		if w.Detail == "" {
			return nil, t.fault(i, "a warning needs a detail")
		}
		if w.Placed = t.cell(i, "lon") != "" || t.cell(i, "lat") != ""; w.Placed {
			if w.At, err = t.position(i); err != nil {
				return nil, err
			}
		}
		out = append(out, w)
	}
	return out, nil
}

func writeWarnings(ws []setting.Warning) []byte {
	t := table{header: warningsColumns}
	for _, w := range ws {
		row := []string{w.Code, "", "", w.Detail}
		if w.Placed {
			row[1], row[2] = decimal(w.At.Lon), decimal(w.At.Lat)
		}
		t.rows = append(t.rows, row)
	}
	return t.write()
}
