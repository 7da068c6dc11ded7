package annotate

import (
	"bytes"
	"context"
	"encoding/csv"
	"fmt"
	"io"
	"strings"
	"testing"
)

const benchRows = 10_000

// benchInput is a table, or lines of objects, of sites all over the globe.
func benchInput(before, row string) string {
	var b strings.Builder
	b.WriteString(before)
	for i := range benchRows {
		fmt.Fprintf(&b, row, i, float64(i*7919%36000)/100-180, float64(i*104729%17900)/100-89)
	}
	return b.String()
}

func benchmarkRun(b *testing.B, f Format, in string) {
	o := Options{Lookup: lookup(b, f)}
	b.SetBytes(int64(len(in)))
	for b.Loop() {
		st, err := Run(context.Background(), strings.NewReader(in), io.Discard, f, o)
		if err != nil || st.Rows != benchRows || st.Errors != 0 {
			b.Fatalf("%+v, %v", st, err)
		}
	}
	b.ReportMetric(float64(b.N)*benchRows/b.Elapsed().Seconds(), "rows/s")
}

const (
	csvHeader = "id,name,lon,lat,note\n"
	csvRow    = "%06d,some site,%.2f,%.2f,a note of some length\n"
)

func BenchmarkCSV(b *testing.B) { benchmarkRun(b, CSV, benchInput(csvHeader, csvRow)) }

func BenchmarkNDJSON(b *testing.B) {
	benchmarkRun(b, NDJSON, benchInput("", `{"id":"%06d","lon":%.2f,"lat":%.2f}`+"\n"))
}

// BenchmarkCopyCSV is the least that a pass over a table costs: encoding/csv
// reads and writes it unchanged.
func BenchmarkCopyCSV(b *testing.B) {
	in := benchInput(csvHeader, csvRow)
	b.SetBytes(int64(len(in)))
	var out bytes.Buffer
	for b.Loop() {
		out.Reset()
		r, w := csv.NewReader(strings.NewReader(in)), csv.NewWriter(&out)
		r.ReuseRecord = true
		for {
			row, err := r.Read()
			if err == io.EOF {
				break
			}
			if err != nil {
				b.Fatal(err)
			}
			if err := w.Write(row); err != nil {
				b.Fatal(err)
			}
		}
		if w.Flush(); out.String() != in {
			b.Fatal("the copy differs")
		}
	}
	b.ReportMetric(float64(b.N)*benchRows/b.Elapsed().Seconds(), "rows/s")
}
