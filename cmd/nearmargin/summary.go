package main

import (
	"bufio"
	"cmp"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"maps"
	"math"
	"slices"
	"strings"
	"unicode"

	"nearmargin/api/annotate"
	"nearmargin/setting"
	"nearmargin/setting/boundary"
)

func summaryFlags(f *flags) {
	f.modelFlag()
	readFlags(f)
	f.set.BoolVar(&f.asJSON, "json", false, "write JSON instead of tables")
	f.set.IntVar(&f.rows, "rows", 0, "at most this `number` of rows listed of each kind, 1 to 1000; 0: 20 in tables, 1000 in JSON")
}

// distanceBinsKm are the upper ends of the histogram's bins but the last, in km.
var distanceBinsKm = [...]float64{10, 25, 50, 100, 200, 400, 800, 1600}

// How many rows of a kind a summary lists by number.
const (
	mostRows        = 1000
	mostRowsInTable = 20
)

// summaryCount is how many rows have a label or type.
type summaryCount struct {
	Name string `json:"name"`
	Rows int    `json:"rows"`
}

// summaryBin is how many rows lie at a distance from the nearest boundary.
type summaryBin struct {
	FromKm float64  `json:"from_km"`
	ToKm   *float64 `json:"to_km"` // null: no upper end
	Rows   int      `json:"rows"`
}

// summaryRow is a row that a reader should look at.
type summaryRow struct {
	Row    int64  `json:"row"`
	Name   string `json:"name"`
	Label  string `json:"setting,omitempty"`
	Reason string `json:"reason"`
	at     setting.Site
	brief  bool // the file says only what speaks for the label
}

// fileSummary is the summary of an annotated file.
type fileSummary struct {
	File          string         `json:"file"`
	Rows          int            `json:"rows"`
	Answered      int            `json:"answered"`
	Areas         int            `json:"areas"`
	Models        []string       `json:"models"`
	Settings      []summaryCount `json:"settings"`
	Confidence    []summaryCount `json:"confidence"`
	BoundaryTypes []summaryCount `json:"nearest_boundary_types"`
	Distances     []summaryBin   `json:"nearest_boundary_distances"`
	Low           int            `json:"low_confidence"`
	LowRows       []summaryRow   `json:"low_confidence_rows"` // the first of them
	Errors        int            `json:"errors"`
	ErrorRows     []summaryRow   `json:"error_rows"` // the first of them
}

// summary counts an annotated file.
func summary(p *program, ctx context.Context, f *flags) error {
	s := fileSummary{Models: []string{}, LowRows: []summaryRow{}, ErrorRows: []summaryRow{}}
	labels, types, confidences := map[string]int{}, map[string]int{}, map[string]int{}
	bins := make([]int, len(distanceBinsKm)+1)
	if f.rows < 0 || f.rows > mostRows {
		return usageError("--rows is %d; want 0 to %d", f.rows, mostRows)
	}
	listed := f.rows
	if listed == 0 && f.asJSON {
		listed = mostRows
	} else if listed == 0 {
		listed = mostRowsInTable
	}
	var err error
	s.File, err = p.readAnnotated(ctx, f, func(r annotate.Row) error {
		s.Rows++
		if r.Model != "" && !slices.Contains(s.Models, r.Model) {
			s.Models = append(s.Models, r.Model)
		}
		switch {
		case r.Area:
			s.Areas++
			return nil
		case r.Label == "":
			s.Errors++
			if len(s.ErrorRows) < listed {
				s.ErrorRows = append(s.ErrorRows, summaryRow{Row: r.Number, Name: r.Name, Reason: cmp.Or(r.Error, "no answer")})
			}
			return nil
		}
		s.Answered++
		labels[r.Label]++
		types[r.BoundaryType]++
		confidences[r.Confidence]++
		if !math.IsNaN(r.DistanceKm) {
			i, _ := slices.BinarySearchFunc(distanceBinsKm[:], r.DistanceKm, func(end, d float64) int {
				if d >= end { // a bin holds its lower end
					return -1
				}
				return 1
			})
			bins[i]++
		}
		if r.Confidence == "low" {
			s.Low++
			if len(s.LowRows) < listed {
				s.LowRows = append(s.LowRows, summaryRow{r.Number, r.Name, r.Label, r.Reason, setting.SiteAt(r.Lon, r.Lat), r.Brief})
			}
		}
		return nil
	})
	if err != nil {
		return err
	}
	if err := s.explain(f); err != nil {
		return err
	}
	s.Settings = ordered(labels, names(setting.AllLabels[:]))
	s.BoundaryTypes = ordered(types, names(boundary.AllTypes[:]))
	s.Confidence = ordered(confidences, []string{"high", "medium", "low"})
	from := 0.0
	for i, n := range bins {
		b := summaryBin{FromKm: from, Rows: n}
		if i < len(distanceBinsKm) {
			b.ToKm = &distanceBinsKm[i]
			from = distanceBinsKm[i]
		}
		s.Distances = append(s.Distances, b)
	}
	if f.asJSON {
		e := json.NewEncoder(p.stdout)
		e.SetEscapeHTML(false)
		e.SetIndent("", "  ")
		return e.Encode(s)
	}
	return s.write(p.stdout)
}

// explain says of the rows of low confidence what else they could be, where the file
// does not: a table has no column for it. It asks the model of the file again.
func (s *fileSummary) explain(f *flags) error {
	if len(s.LowRows) == 0 || !slices.ContainsFunc(s.LowRows, func(r summaryRow) bool { return r.brief }) {
		return nil
	}
	b, err := load(f.model)
	if err != nil {
		return err
	}
	if !slices.Contains(s.Models, b.Model.Ref()) {
		return nil
	}
	l, err := b.Model.Lookup(setting.Options{})
	if err != nil {
		return err
	}
	var a setting.Answer
	for i := range s.LowRows {
		r := &s.LowRows[i]
		if !r.brief || l.At(r.at, &a) != nil || a.Label.String() != r.Label {
			continue // a depth or an uncertainty that the answer took in is not known here
		}
		var all []string
		for k := range a.Alternatives.All() {
			alt := &a.Alternatives.All()[k]
			all = append(all, alt.Label.String()+": "+alt.Text())
		}
		if len(all) > 0 {
			r.Reason = strings.Join(all, "; ")
		}
	}
	return nil
}

// names returns how things are spelt.
func names[T fmt.Stringer](list []T) (out []string) {
	for _, x := range list {
		out = append(out, x.String())
	}
	return out
}

// ordered lists counts in an order; what the order does not know comes last.
func ordered(counts map[string]int, order []string) []summaryCount {
	out := []summaryCount{}
	for _, name := range order {
		if n := counts[name]; n > 0 {
			out = append(out, summaryCount{name, n})
		}
	}
	for _, name := range slices.Sorted(maps.Keys(counts)) {
		if !slices.Contains(order, name) {
			out = append(out, summaryCount{name, counts[name]})
		}
	}
	return out
}

// write writes the summary as tables for a terminal.
func (s *fileSummary) write(out io.Writer) error {
	w := bufio.NewWriter(out)
	fmt.Fprintf(w, "%s: %d rows, %d answered, %d without an answer", forTerminal(s.File, 200), s.Rows, s.Answered, s.Errors)
	if s.Areas > 0 {
		fmt.Fprintf(w, ", %d areas not counted below", s.Areas)
	}
	fmt.Fprintf(w, "\nmodel: %s\n", forTerminal(cmp.Or(strings.Join(s.Models, ", "), "none"), 1000))
	table := func(title string, list []summaryCount) {
		fmt.Fprintf(w, "\n%s\n", title)
		for _, c := range list {
			writeBar(w, forTerminal(c.Name, 40), c.Rows, s.Answered)
		}
	}
	table("Setting", s.Settings)
	table("Confidence", s.Confidence)
	table("Type of the nearest boundary", s.BoundaryTypes)
	fmt.Fprintf(w, "\nDistance to the nearest boundary\n")
	for _, b := range s.Distances {
		name := fmt.Sprintf("%g km and more", b.FromKm)
		if b.ToKm != nil {
			name = fmt.Sprintf("%g to %g km", b.FromKm, *b.ToKm)
		}
		writeBar(w, name, b.Rows, s.Answered)
	}
	rows := func(title string, list []summaryRow, all int) {
		if all == 0 {
			return
		}
		fmt.Fprintf(w, "\n%s\n", title)
		for _, r := range list {
			fmt.Fprintf(w, "  row %d", r.Row)
			if r.Name != "" {
				fmt.Fprintf(w, " (%s)", forTerminal(r.Name, 60))
			}
			if r.Label != "" {
				fmt.Fprintf(w, " %s", forTerminal(r.Label, 60))
			}
			fmt.Fprintf(w, ": %s\n", forTerminal(r.Reason, 1000))
		}
		if all > len(list) {
			fmt.Fprintf(w, "  and %d more (--rows lists up to %d, --json for programs)\n", all-len(list), mostRows)
		}
	}
	rows("Low confidence: moved by one sigma, a label of another family is met", s.LowRows, s.Low)
	rows("Without an answer", s.ErrorRows, s.Errors)
	return w.Flush()
}

// forTerminal makes a text of a stranger's file fit for a line on a terminal: on one line,
// without characters that would steer the terminal, and not too long.
func forTerminal(s string, most int) string {
	s = strings.Map(func(r rune) rune {
		if !unicode.IsPrint(r) && !unicode.IsSpace(r) {
			return '\uFFFD'
		}
		return r
	}, s)
	r := []rune(strings.Join(strings.Fields(s), " "))
	if len(r) > most {
		return string(r[:most-1]) + "\u2026"
	}
	return string(r)
}

// writeBar writes a count with its share and a bar of at most 40 characters.
func writeBar(w io.Writer, name string, n, all int) {
	share := 0.0
	if all > 0 {
		share = float64(n) / float64(all)
	}
	line := fmt.Sprintf("  %-24s %8d %6.1f %%  %s", name, n, share*100, strings.Repeat("#", int(math.Ceil(share*40))))
	fmt.Fprintln(w, strings.TrimRight(line, " "))
}
