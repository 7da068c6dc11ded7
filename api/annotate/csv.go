package annotate

import (
	"bufio"
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"unicode/utf8"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

// csvJob is what one pass over a table needs.
type csvJob struct {
	o          *Options
	in         *csv.Reader
	out        *bufio.Writer
	comma      byte
	decimal    bool   // decimal commas are read
	newline    string // as in the input
	width      int    // columns of the header
	openHeader bool   // the last of them has a line break in its name
	replaced   []int  // for each input column the added column that takes its place, or -1
	appended   []int  // added columns that stand after the input's
	lon, lat   int
	depth, unc int // -1 where not asked for
	elevation  int
	guard      *guard
	skipped    int64 // bytes before those that the reader has seen
	buf        []byte
	cells      wire.Cells
	answer     setting.Answer
}

// byteOrderMark may start a UTF-8 file.
var byteOrderMark = []byte("\xef\xbb\xbf")

// annotateCSV copies a table and adds columns.
func annotateCSV(ctx context.Context, in io.Reader, out io.Writer, o *Options) (Stats, error) {
	var st Stats
	g := &guard{r: in, limit: int64(o.RowBytes)}
	br := bufio.NewReaderSize(g, 64<<10)
	j := &csvJob{o: o, out: bufio.NewWriterSize(out, 64<<10)}
	skipped, err := j.sniff(br)
	if err != nil {
		return st, err
	}
	j.in = csv.NewReader(br)
	j.in.Comma = rune(j.comma)
	j.in.FieldsPerRecord = -1
	j.in.LazyQuotes = true
	j.in.ReuseRecord = true
	if err := j.header(); err != nil {
		return st, err
	}
	if j.openHeader && g.ended && skipped+j.in.InputOffset() == g.read && g.last != '"' {
		return st, badLine(1, "a quotation mark is not closed; it takes in the rest of the input")
	}
	j.guard, j.skipped = g, skipped
	st, err = inOrder(ctx, o, j.read, j.worker, func(b []byte) error {
		_, err := j.out.Write(b)
		return err
	})
	if err != nil {
		return st, err
	}
	if err := j.out.Flush(); err != nil {
		return st, err
	}
	return st, nil
}

// csvRows are the fields of a chunk's rows, end to end.
type csvRows struct {
	fields []string
	ends   []int
}

// read fills a chunk with rows.
func (j *csvJob) read(c *chunk[csvRows]) (more bool, err error) {
	r := &c.rows
	r.fields, r.ends = r.fields[:0], r.ends[:0]
	start := j.in.InputOffset()
	for c.n < chunkRows && j.in.InputOffset()-start < chunkBytes {
		from := j.in.InputOffset()
		j.guard.mark(j.skipped + from)
		row, err := j.in.Read()
		if err == nil && j.in.InputOffset()-from > int64(j.o.RowBytes) { // the guard alone is as coarse as the reads are
			err = errRowTooLong
		}
		if err == io.EOF {
			return false, nil
		}
		if err != nil {
			return false, csvFault(err, j.o.RowBytes)
		}
		if n := len(row); j.guard.ended && j.skipped+j.in.InputOffset() == j.guard.read && strings.IndexByte(row[n-1], '\n') >= 0 && j.guard.last != '"' {
			line, _ := j.in.FieldPos(n - 1)
			return false, badLine(line, "a quotation mark is not closed; it takes in the rest of the input")
		}
		c.n++
		r.fields = append(r.fields, row...)
		r.ends = append(r.ends, len(r.fields))
	}
	return true, nil
}

// worker returns a function that makes output rows of a chunk.
func (j *csvJob) worker() func(*chunk[csvRows]) {
	w := *j
	return func(c *chunk[csvRows]) {
		w.buf = c.out
		from := 0
		for _, to := range c.rows.ends {
			if !w.row(c.rows.fields[from:to]) {
				c.errors++
			}
			from = to
		}
		c.out = w.buf
		clear(c.rows.fields) // the text of the rows may go
	}
}

// sniff looks at the first line: byte order mark, separator, end of line. It
// returns the number of bytes that it took away.
func (j *csvJob) sniff(br *bufio.Reader) (int64, error) {
	head, err := peekLine(br)
	if err != nil {
		return 0, csvFault(err, j.o.RowBytes)
	}
	if bytes.HasPrefix(head, []byte("\xff\xfe")) || bytes.HasPrefix(head, []byte("\xfe\xff")) {
		return 0, badLine(1, "the file is UTF-16; save it as UTF-8")
	}
	var skipped int64
	if bytes.HasPrefix(head, byteOrderMark) {
		n, _ := br.Discard(len(byteOrderMark)) // it has just been peeked
		skipped = int64(n)
		head = head[n:]
	}
	head = bytes.TrimLeft(head, "\r\n") // blank lines are skipped
	line, _ := firstLine(head)
	if len(bytes.TrimSpace(line)) == 0 && len(line) == len(head) {
		return 0, badLine(1, "the input is empty; the first line must name the columns, such as id,lon,lat")
	}
	if bytes.IndexByte(line, 0) >= 0 {
		return 0, badLine(1, "the first line holds a zero byte; this is not a text table")
	}
	j.newline = "\n"
	if bytes.HasSuffix(line, []byte("\r\n")) {
		j.newline = "\r\n"
	}
	j.comma = separator(line)
	j.decimal = j.comma != ','
	return skipped, nil
}

// peekLine returns what can be had up to the end of the first line that is not
// blank: that line at least, and 64 KiB at most. It does not wait for more.
func peekLine(br *bufio.Reader) ([]byte, error) {
	for n := 1; ; n = br.Buffered() + 1 {
		_, err := br.Peek(min(n, br.Size()))
		head, _ := br.Peek(br.Buffered())
		_, whole := firstLine(bytes.TrimLeft(bytes.TrimPrefix(head, byteOrderMark), "\r\n"))
		switch {
		case whole || len(head) == br.Size() || err == io.EOF:
			return head, nil
		case err != nil:
			return nil, err
		}
	}
}

// firstLine returns the text up to the first line break outside of quotes, with it,
// and whether there is one.
func firstLine(text []byte) (line []byte, whole bool) {
	quoted := false
	for i, c := range text {
		if c == '"' {
			quoted = !quoted
		}
		if c == '\n' && !quoted {
			return text[:i+1], true
		}
	}
	return text, false
}

// separator returns which of comma, semicolon and tab stands most often outside
// of quotes; the comma where none does.
func separator(line []byte) byte {
	best, most := byte(','), 0
	for _, sep := range []byte{',', ';', '\t'} {
		n, quoted := 0, false
		for _, c := range line {
			switch {
			case c == '"':
				quoted = !quoted
			case c == sep && !quoted:
				n++
			}
		}
		if n > most {
			best, most = sep, n
		}
	}
	return best
}

func (j *csvJob) header() error {
	names, err := j.in.Read()
	if err == io.EOF {
		return badLine(1, "the input is empty; the first line must name the columns, such as id,lon,lat")
	}
	if err != nil {
		return csvFault(err, j.o.RowBytes)
	}
	names = slices.Clone(names)
	if len(names) > MaxColumns {
		return badLine(1, "the first line names %d columns and %d are the limit", len(names), MaxColumns)
	}
	for i := range names {
		if !utf8.ValidString(names[i]) {
			return badLine(1, "the name of column %d is not UTF-8; save the file as UTF-8", i+1)
		}
	}
	o := j.o
	if j.lon, err = findColumn(names, o.LonColumn, "lon_column", "longitude", lonName); err != nil {
		return err
	}
	if j.lat, err = findColumn(names, o.LatColumn, "lat_column", "latitude", latName); err != nil {
		return err
	}
	if j.lon == j.lat {
		return &InputError{Line: 1, Parameter: "lat_column", Detail: fmt.Sprintf("column %q is named as longitude and as latitude", clip(names[j.lon]))}
	}
	if j.depth, err = optionalColumn(names, o.DepthColumn, "depth_column", "depth"); err != nil {
		return err
	}
	if j.unc, err = optionalColumn(names, o.UncertaintyColumn, "uncertainty_column", "uncertainty"); err != nil {
		return err
	}
	if j.elevation, err = optionalColumn(names, o.ElevationColumn, "elevation_column", "elevation"); err != nil {
		return err
	}
	j.width = len(names)
	j.openHeader = strings.IndexByte(names[len(names)-1], '\n') >= 0
	added := map[string]int{}
	for i, c := range wire.Columns {
		added[o.Prefix+c] = i
	}
	present := [wire.NumColumns]bool{}
	for _, n := range names {
		k, ok := added[n]
		if !ok {
			k = -1
		} else {
			present[k] = true
		}
		j.replaced = append(j.replaced, k)
	}
	for i := range wire.Columns {
		if !present[i] {
			j.appended = append(j.appended, i)
		}
	}
	for i, n := range names {
		j.buf = j.field(j.buf, i, n)
	}
	for _, k := range j.appended {
		j.buf = append(j.buf, j.comma)
		j.buf = append(j.buf, o.Prefix...)
		j.buf = append(j.buf, wire.Columns[k]...)
	}
	j.buf = append(j.buf, j.newline...)
	_, err = j.out.Write(j.buf)
	return err
}

func optionalColumn(names []string, given, parameter, what string) (int, error) {
	if given == "" {
		return -1, nil
	}
	return findColumn(names, given, parameter, what, nil)
}

// row appends the output row to j.buf and reports whether it has an answer.
func (j *csvJob) row(in []string) bool {
	err := j.ask(in)
	if err != nil {
		j.cells.SetError(err.Error())
	} else {
		j.cells.Set(&j.answer)
	}
	for i := range j.width {
		switch {
		case j.replaced[i] >= 0:
			j.buf = j.fieldBytes(j.buf, i, j.cells.Value(j.replaced[i]))
		case i < len(in):
			j.buf = j.field(j.buf, i, in[i])
		default:
			j.buf = j.field(j.buf, i, "")
		}
	}
	for _, k := range j.appended {
		j.buf = j.fieldBytes(j.buf, 1, j.cells.Value(k))
	}
	for i := j.width; i < len(in); i++ { // fields that the header does not name stay, at the end
		j.buf = j.field(j.buf, 1, in[i])
	}
	j.buf = append(j.buf, j.newline...)
	return err == nil
}

func (j *csvJob) ask(in []string) error {
	for i := j.width; i < len(in); i++ {
		if strings.TrimSpace(in[i]) != "" {
			return fmt.Errorf("the row has %d fields and the header %d; the fields beyond stand at the end of the row", len(in), j.width)
		}
	}
	cell := func(i int) string {
		if i < 0 || i >= len(in) {
			return ""
		}
		return in[i]
	}
	if len(in) < j.width && (j.lon >= len(in) || j.lat >= len(in)) {
		return fmt.Errorf("the row has %d fields and the header %d; longitude or latitude is missing", len(in), j.width)
	}
	s, err := j.o.site(cells{cell(j.lon), cell(j.lat), cell(j.depth), cell(j.unc), cell(j.elevation)}, j.decimal)
	if err != nil {
		return err
	}
	return j.o.Lookup.At(s, &j.answer)
}

// field appends a separator, where it is not the first field, and a value,
// quoted where it must be.
func (j *csvJob) field(b []byte, i int, v string) []byte {
	if i > 0 {
		b = append(b, j.comma)
	}
	if !j.needsQuotes(v) {
		return append(b, v...)
	}
	b = append(b, '"')
	for k := range len(v) {
		if v[k] == '"' {
			b = append(b, '"')
		}
		b = append(b, v[k])
	}
	return append(b, '"')
}

func (j *csvJob) fieldBytes(b []byte, i int, v []byte) []byte {
	for _, c := range v {
		if c == j.comma || c == '"' || c == '\n' || c == '\r' {
			return j.field(b, i, string(v))
		}
	}
	if i > 0 {
		b = append(b, j.comma)
	}
	return append(b, v...)
}

func (j *csvJob) needsQuotes(v string) bool {
	for i := range len(v) {
		if c := v[i]; c == j.comma || c == '"' || c == '\n' || c == '\r' {
			return true
		}
	}
	return v != "" && (v[0] == ' ' || v[0] == '\t')
}

func csvFault(err error, rowBytes int) error {
	var p *csv.ParseError
	switch {
	case errors.Is(err, errRowTooLong):
		return &InputError{Detail: fmt.Sprintf("a row is longer than %d bytes; is a quotation mark not closed?", rowBytes), Line: 1}
	case errors.As(err, &p):
		return badLine(p.Line, "%v", p.Err)
	}
	return err
}
