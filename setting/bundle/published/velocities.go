package published

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/bundle"
)

// forms are the sets of columns in which a table may give angular velocities, the
// richest first.
var forms = [...]bundle.MotionForm{bundle.CovarianceForm, bundle.CartesianForm, bundle.PoleForm}

// ReadVelocities reads a CSV table of angular velocities. Its first line names the
// columns, in any order and any case: plate, and those of one form of a model's
// table ([bundle.MotionColumns]; the σ of a pole's rate may be absent or empty).
// Columns of other names are passed over.
//
// A plate is found by its column name, if the table has one and the name is that
// of a plate; else by its code, in upper case. NB is North Bismarck here and Nubia
// in some tables: where no row is NU and no name tells, a row NB is rejected.
func ReadVelocities(name string, text io.Reader, plates []setting.Plate, codes Codes) (bundle.MotionForm, []bundle.MotionRow, Tally, error) {
	t := Tally{File: name}
	r := csv.NewReader(text)
	r.TrimLeadingSpace, r.FieldsPerRecord = true, -1
	header, err := r.Read()
	if err != nil {
		return 0, nil, t, fmt.Errorf("%s: the first line must name the columns: %w", name, err)
	}
	for i := range header {
		header[i] = strings.ToLower(strings.TrimSpace(strings.TrimPrefix(header[i], "\ufeff")))
	}
	form, columns, err := formOf(header)
	if err != nil {
		return 0, nil, t, fmt.Errorf("%s:1: %w", name, err)
	}
	p := plateFinder{header: header, byName: map[string]string{}, codes: codes}
	for _, x := range plates {
		p.byName[strings.ToLower(x.Name)] = x.Code
	}
	rows, err := readVelocityRows(r, &t, form, columns, p)
	if err != nil {
		return 0, nil, t, fmt.Errorf("%s: %w", name, err)
	}
	if len(rows) == 0 {
		return 0, nil, t, fmt.Errorf("%s: no row could be read%s", name, t.first())
	}
	return form, rows, t, nil
}

func readVelocityRows(r *csv.Reader, t *Tally, form bundle.MotionForm, columns []int, p plateFinder) ([]bundle.MotionRow, error) {
	var rows []bundle.MotionRow
	lines := map[string]int{}
	bare := 0 // the line of a row NB that no name explains
	for {
		rec, err := r.Read()
		if err == io.EOF {
			break
		}
		if pe := (*csv.ParseError)(nil); errors.As(err, &pe) {
			t.reject(pe.StartLine, "%v", pe.Err)
			continue
		}
		if err != nil {
			return nil, err
		}
		line, _ := r.FieldPos(0)
		row, byName, err := velocityRow(rec, form, columns, p)
		if err == nil && lines[row.Plate] > 0 {
			err = fmt.Errorf("plate %s stands in line %d already", row.Plate, lines[row.Plate])
		}
		if err != nil {
			t.reject(line, "%v", err)
			continue
		}
		if row.Plate == "NB" && !byName {
			bare = line
		}
		lines[row.Plate] = line
		rows = append(rows, row)
		t.Read++
	}
	if bare > 0 && lines["NU"] == 0 {
		t.Read--
		t.reject(bare, "NB is North Bismarck in a model and Nubia in some tables, and this table has no NU; map it (NB=NU), or give the table a column name")
		rows = slices.DeleteFunc(rows, func(x bundle.MotionRow) bool { return x.Plate == "NB" })
	}
	return rows, nil
}

// formOf returns the form that a header holds the columns of, and where: the
// plate's, then the numbers'; -1 for a σ that is absent.
func formOf(header []string) (bundle.MotionForm, []int, error) {
	plate := slices.Index(header, "plate")
	var wanted []string
	for _, f := range forms {
		at := []int{plate}
		names := bundle.MotionColumns(f)
		for _, c := range names {
			at = append(at, slices.Index(header, c))
		}
		if f == bundle.PoleForm && at[4] < 0 {
			if plate >= 0 && !slices.Contains(at[:4], -1) {
				return f, at, nil
			}
		} else if !slices.Contains(at, -1) {
			return f, at, nil
		}
		wanted = append(wanted, "plate,"+strings.Join(names, ","))
	}
	return 0, nil, fmt.Errorf("the columns are %s; they must hold %s", strings.Join(header, ","), strings.Join(wanted, " or "))
}

// plateFinder finds which plate a row is of.
type plateFinder struct {
	header []string
	byName map[string]string
	codes  Codes
}

func (p plateFinder) find(rec []string, code string) (plate string, byName bool, err error) {
	if i := slices.Index(p.header, "name"); i >= 0 && i < len(rec) {
		if plate, ok := p.byName[strings.ToLower(strings.TrimSpace(rec[i]))]; ok {
			return plate, true, nil
		}
	}
	code = strings.ToUpper(strings.TrimSpace(code))
	if plate, ok := p.codes[code]; ok {
		return plate, true, nil
	}
	if !isCode(code) {
		return "", false, fmt.Errorf("plate %q is no code of two letters, and no name tells which it is", code)
	}
	return code, false, nil
}

func velocityRow(rec []string, form bundle.MotionForm, columns []int, p plateFinder) (row bundle.MotionRow, byName bool, err error) {
	for _, c := range columns {
		if c >= len(rec) {
			return row, false, fmt.Errorf("has %d fields, %d are needed", len(rec), c+1)
		}
	}
	if row.Plate, byName, err = p.find(rec, rec[columns[0]]); err != nil {
		return row, false, err
	}
	names := bundle.MotionColumns(form)
	for i, c := range columns[1:] {
		field := ""
		if c >= 0 {
			field = strings.TrimSpace(rec[c])
		}
		if field == "" && form == bundle.PoleForm && i == 3 {
			row.Numbers = append(row.Numbers, "")
			continue
		}
		x, err := strconv.ParseFloat(field, 64)
		if err != nil || x-x != 0 {
			return row, false, fmt.Errorf("%s is %q; it must be a number", names[i], field)
		}
		row.Numbers = append(row.Numbers, plain(field))
	}
	return row, byName, row.Check(form)
}
