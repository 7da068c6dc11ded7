package api

import (
	"encoding/json"
	"errors"
	"math"
	"net/http"
	"net/http/httptest"
	"net/url"
	"strconv"
	"testing"
	"unicode/utf8"
)

// TestParseDecimal: which spellings of a number are read, and as what.
func TestParseDecimal(t *testing.T) {
	for _, c := range []struct {
		in   string
		want float64
		ok   bool
	}{
		{"0", 0, true}, {"-0", 0, true}, {"+7", 7, true}, {"7.", 7, true}, {".5", .5, true}, {"-.5e1", -5, true},
		{"1e-300", 1e-300, true}, {"1E2", 100, true}, {"000012", 12, true}, {"72.40000", 72.4, true},
		{"", 0, false}, {".", 0, false}, {"-", 0, false}, {"e1", 0, false}, {"1e", 0, false}, {"1e1000", 0, false},
		{"1 ", 0, false}, {" 1", 0, false}, {"1_0", 0, false}, {"0x1", 0, false}, {"nan", 0, false}, {"inf", 0, false},
		{"1,5", 0, false}, {"1.2.3", 0, false}, {"--1", 0, false}, {"١", 0, false}, {"1e400", 0, false}, {"1\n", 0, false},
	} {
		got, err := parseDecimal(c.in)
		if (err == nil) != c.ok || got != c.want {
			t.Errorf("parseDecimal(%q) = %g, %v", c.in, got, err)
		}
	}
}

// TestParseBox: boxes as callers write them.
func TestParseBox(t *testing.T) {
	for _, c := range []struct {
		in string
		ok bool
	}{
		{"-180,-90,180,90", true}, {"170,-10,-170,10", true}, {" 1, 2 ,3,4", true}, {"0,0,360,0", true},
		{"1,2,3,4,5", false}, {",,,", false}, {"1;2;3;4", false}, {"1,2,3,NaN", false}, {"-181,0,0,0", false}, {"0,0,361,0", false},
	} {
		if _, err := parseBox(c.in); (err == nil) != c.ok {
			t.Errorf("parseBox(%q): %v", c.in, err)
		}
	}
}

// FuzzQuery feeds raw queries to the parser: expect no panic, faults that name a
// parameter in valid UTF-8, and numbers that strconv reads as the same.
func FuzzQuery(f *testing.F) {
	for _, seed := range []string{
		"", "lon=1&lat=2", "lon=1&lon=2", "lon=%zz", "lon=%ff", "a;b", "lon=+1", "lon=1e3&lat=-.5", "lon=NaN", "&&&=", "lon", "%00=%00", "lon=1&x=%F0%9F",
	} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, raw string) {
		q := newQuery(raw, "lon", "lat")
		values, parseErr := url.ParseQuery(raw)
		lon := q.number("lon", true)
		err := q.err()
		if err == nil {
			if parseErr != nil || len(values["lon"]) != 1 {
				t.Fatalf("%q is let through: %v", raw, parseErr)
			}
			want, err := strconv.ParseFloat(values.Get("lon"), 64)
			if err != nil || lon != want || math.IsInf(lon, 0) {
				t.Fatalf("%q: lon %g, want %g, %v", raw, lon, want, err)
			}
			for name := range values {
				if name != "lon" && name != "lat" {
					t.Fatalf("%q: %q is let through", raw, name)
				}
			}
			return
		}
		var p *Problem
		if !errors.As(err, &p) || p.Status != http.StatusBadRequest || len(p.Errors) == 0 {
			t.Fatalf("%q: %v", raw, err)
		}
		for _, e := range p.Errors {
			if e.Parameter == "" || !utf8.ValidString(e.Parameter) || e.Detail == "" {
				t.Fatalf("%q: fault %+v", raw, e)
			}
		}
	})
}

// FuzzPoint feeds raw queries to the whole path: expect 200, 400 or 404, and JSON.
func FuzzPoint(f *testing.F) {
	for _, seed := range []string{"lon=1&lat=2", "lon=180&lat=90&depth_km=1", "lon=-180&lat=-90&model=x", "lon=1&lat=2&motion=%00", "lon=1e-320&lat=-0"} {
		f.Add(seed)
	}
	r := newRig(f)
	f.Fuzz(func(t *testing.T, raw string) {
		req := httptest.NewRequest(http.MethodGet, "/v1/point", nil)
		req.URL.RawQuery = raw
		w := httptest.NewRecorder()
		r.ServeHTTP(w, req)
		if w.Code != http.StatusOK && w.Code != http.StatusBadRequest && w.Code != http.StatusNotFound {
			t.Fatalf("%q: status %d", raw, w.Code)
		}
		if !json.Valid(w.Body.Bytes()) || !utf8.Valid(w.Body.Bytes()) {
			t.Fatalf("%q: not JSON: %s", raw, w.Body)
		}
	})
}
