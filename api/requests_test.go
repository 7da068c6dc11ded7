package api

import (
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"slices"
	"strings"
	"testing"

	"nearmargin/api/annotate"
	"nearmargin/api/internal/testmodel"
)

// refusal is what a bad request is to get: the place of every fault and a part
// of what is said of it.
type refusal struct {
	name              string
	method, target    string
	contentType, body string
	status            int
	kind              string
	place, detail     []string // of each of errors[]
	allow             []string
}

// place names where a fault is.
func place(f FieldFault) string {
	switch {
	case f.Parameter != "":
		return f.Parameter
	case f.Pointer != nil:
		return "#" + *f.Pointer
	case f.Line > 0:
		return fmt.Sprintf("line %d", f.Line)
	}
	return "nowhere"
}

func (c *refusal) check(t *testing.T, r *rig) {
	t.Helper()
	method := c.method
	if method == "" {
		method = http.MethodGet
	}
	w := r.ask(method, c.target, c.contentType, c.body)
	if w.Code != c.status {
		t.Fatalf("status %d, want %d: %s", w.Code, c.status, w.Body)
	}
	if c.allow != nil {
		got := strings.Split(w.Header().Get("Allow"), ", ")
		slices.Sort(got)
		if !slices.Equal(got, c.allow) {
			t.Errorf("Allow %v, want %v", got, c.allow)
		}
	}
	body := w.Body.Bytes()
	p := problem(t, w)
	valid(t, schema(t, "Problem"), c.target, body)
	if p.Status != c.status || p.Type != problemType+c.kind {
		t.Errorf("status %d, type %q, want %d, %q", p.Status, p.Type, c.status, problemType+c.kind)
	}
	var places []string
	for _, f := range p.Errors {
		places = append(places, place(f))
	}
	if !slices.Equal(places, c.place) {
		t.Fatalf("faults at %q, want %q: %s", places, c.place, body)
	}
	for i, want := range c.detail {
		if !strings.Contains(p.Errors[i].Detail, want) {
			t.Errorf("fault %d: %q does not say %q", i+1, p.Errors[i].Detail, want)
		}
	}
}

// one is the list of one.
func one(s string) []string { return []string{s} }

// TestBadQueries: given a server, when a query is at fault, expect a problem
// document that names the parameter and what would be right.
func TestBadQueries(t *testing.T) {
	const invalid = "invalid-request"
	long := strings.Repeat("9", 5000)
	r := newRig(t)
	for _, c := range []refusal{
		{name: "nothing given", target: "/v1/point", place: []string{"lon", "lat"}, detail: []string{"lon=12.5", "lat=12.5"}},
		{name: "latitude missing", target: "/v1/point?lon=3", place: one("lat"), detail: one("is missing")},
		{name: "blank", target: "/v1/point?lon=&lat=2", place: one("lon"), detail: one("decimal notation")},
		{name: "words", target: "/v1/point?lon=west&lat=2", place: one("lon"), detail: one(`"west"`)},
		{name: "two words", target: "/v1/point?lon=west&lat=north", place: []string{"lon", "lat"}},
		{name: "NaN", target: "/v1/point?lon=NaN&lat=2", place: one("lon"), detail: one("not a number")},
		{name: "infinity", target: "/v1/point?lon=2&lat=-Infinity", place: one("lat"), detail: one("not a number")},
		{name: "hexadecimal", target: "/v1/point?lon=0x1p3&lat=2", place: one("lon")},
		{name: "underscore", target: "/v1/point?lon=1_0&lat=2", place: one("lon")},
		{name: "decimal comma", target: "/v1/point?lon=7,25&lat=2", place: one("lon"), detail: one("decimal point")},
		{name: "a blank within", target: "/v1/point?lon=%201&lat=2", place: one("lon")},
		{name: "degree sign", target: "/v1/point?lon=7%C2%B0&lat=2", place: one("lon")},
		{name: "too large for a float", target: "/v1/point?lon=1e999&lat=2", place: one("lon"), detail: one("beyond the range")},
		{name: "five thousand digits", target: "/v1/point?lon=" + long + "&lat=2", place: one("lon"), detail: one("...")},
		{name: "latitude above 90", target: "/v1/point?lon=100&lat=90.001", place: one("lat"), detail: one("-90 to 90")},
		{name: "swapped", target: "/v1/point?lon=-36&lat=-172", place: one("lat"), detail: one("swapped?")},
		{name: "longitude below -180", target: "/v1/point?lon=-180.5&lat=0", place: one("lon"), detail: one("-180 to 360")},
		{name: "longitude above 360", target: "/v1/point?lon=360.5&lat=0", place: one("lon"), detail: one("-180 to 360")},
		{name: "too deep", target: "/v1/point?lon=1&lat=1&depth_km=801", place: one("depth_km"), detail: one("-10 to 800")},
		{name: "metres for km", target: "/v1/point?lon=1&lat=1&depth_km=35000", place: one("depth_km")},
		{name: "negative uncertainty", target: "/v1/point?lon=1&lat=1&uncertainty_km=-1", place: one("uncertainty_km"), detail: one("0 to 1000")},
		{name: "older than the Earth", target: "/v1/point?lon=1&lat=1&age_ma=5000", place: one("age_ma"), detail: one("0 to 4600")},
		{name: "doubled", target: "/v1/point?lon=1&lat=1&lon=2", place: one("lon"), detail: one("2 times")},
		{name: "unknown", target: "/v1/point?lon=1&lat=1&depth=3", place: one("depth"), detail: one("depth_km")},
		{name: "other case", target: "/v1/point?Lon=1&lat=1", place: []string{"Lon", "lon"}},
		{name: "a name without end", target: "/v1/point?lon=1&lat=1&" + strings.Repeat("n", 3000) + "=1", place: one(strings.Repeat("n", 60) + "...")},
		{name: "a name that is not UTF-8", target: "/v1/point?lon=1&lat=1&%ff=1", place: one("\uFFFD")},
		{name: "a broken escape", target: "/v1/point?lon=1&lat=1&x=%zz", place: one("query"), detail: one("cannot be read")},
		{name: "a semicolon", target: "/v1/point?lon=1;lat=1", place: []string{"query", "lon", "lat"}},
		{name: "no such motion", target: "/v1/point?lon=1&lat=1&motion=fast", place: one("motion"), detail: one("full, partial")},
		{name: "no such fallback", target: "/v1/point?lon=1&lat=1&motion_fallback=fast", place: one("motion_fallback"), detail: one("full, partial")},
		{name: "three numbers in a box", target: "/v1/boundaries?bbox=1,2,3", place: one("bbox"), detail: one("west,south,east,north")},
		{name: "a word in a box", target: "/v1/boundaries?bbox=1,2,3,x", place: one("bbox"), detail: one(`"x"`)},
		{name: "a box upside down", target: "/v1/boundaries?bbox=1,20,3,10", place: one("bbox"), detail: one("south 20")},
		{name: "a box beyond the pole", target: "/v1/boundaries?bbox=1,20,3,91", place: one("bbox")},
		{name: "an empty box", target: "/v1/boundaries?bbox=", place: one("bbox")},
		{name: "no such type", target: "/v1/boundaries?type=Subduction", place: one("type"), detail: one("spreading_ridge")},
		{name: "a box and a type", target: "/v1/boundaries?bbox=a&type=b", place: []string{"bbox", "type"}},
		{name: "plates of a place", target: "/v1/plates?lon=1", place: one("lon"), detail: one("it takes model")},
		{name: "models with a query", target: "/v1/models?x=1", place: one("x")},
		{name: "a model with a query", target: "/v1/models/" + testmodel.ID + "?x=1", place: one("x")},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.status, c.kind = http.StatusBadRequest, invalid
			c.check(t, r)
		})
	}
}

// TestBadPathsAndMethods: given a server, when there is nothing at a path, or it
// takes another method, expect 404, or 405 with the methods that it takes.
func TestBadPathsAndMethods(t *testing.T) {
	r := newRig(t)
	get, post := []string{"GET", "HEAD", "OPTIONS"}, []string{"OPTIONS", "POST"}
	for _, c := range []refusal{
		{name: "no such path", target: "/v2/point", status: 404, kind: "not-found", place: one("path"), detail: one("/openapi.json")},
		{name: "a slash too many", target: "/v1/point/", status: 404, kind: "not-found", place: one("path")},
		{name: "dots", target: "/v1/../healthz", status: 404, kind: "not-found", place: one("path")},
		{name: "no such model", target: "/v1/models/mine", status: 404, kind: "no-such-model", place: one("model"), detail: one(`"mine"`)},
		{name: "no such edition", target: "/v1/models/" + testmodel.ID + "@6", status: 404, kind: "no-such-model", place: one("model")},
		{name: "a model by path", target: "/v1/point?lon=1&lat=1&model=../../etc/passwd", status: 404, kind: "no-such-model", place: one("model")},
		{name: "boundaries of no model", target: "/v1/boundaries?model=x", status: 404, kind: "no-such-model", place: one("model")},
		{name: "plates of no model", target: "/v1/plates?model=x", status: 404, kind: "no-such-model", place: one("model")},
		{name: "annotate with no model", method: "POST", target: "/v1/annotate?model=x", contentType: "text/csv", body: "lon,lat\n", status: 404, kind: "no-such-model", place: one("model")},
		{name: "post a point", method: "POST", target: "/v1/point?lon=1&lat=1", status: 405, kind: "method-not-allowed", place: one("method"), allow: get},
		{name: "delete a model", method: "DELETE", target: "/v1/models/x", status: 405, kind: "method-not-allowed", place: one("method"), allow: get},
		{name: "get annotate", target: "/v1/annotate", status: 405, kind: "method-not-allowed", place: one("method"), allow: post},
		{name: "a method of one's own", method: "BREW", target: "/healthz", status: 405, kind: "method-not-allowed", place: one("method"), allow: get},
	} {
		t.Run(c.name, func(t *testing.T) { c.check(t, r) })
	}
}

// TestBadBatches: given a server, when a batch as a whole is at fault, expect a
// problem document that names the column, line or pointer.
func TestBadBatches(t *testing.T) {
	const csv, nd, geo, array = "text/csv", "application/x-ndjson", "application/geo+json", "application/json"
	r := newRig(t)
	for _, c := range []refusal{
		{name: "empty table", contentType: csv, place: one("line 1"), detail: one("empty")},
		{name: "blank table", contentType: csv, body: "\r\n\n", place: one("line 1"), detail: one("empty")},
		{name: "no coordinates", contentType: csv, body: "id,x,y\n1,2,3\n", place: one("lon_column"), detail: one("id, x, y")},
		{name: "no latitude", contentType: csv, body: "id,lon\n1,2\n", place: one("lat_column"), detail: one("id, lon")},
		{name: "two longitudes", contentType: csv, body: "lon,Longitude,lat\n1,2,3\n", place: one("lon_column"), detail: one("columns 1 (lon) and 2 (Longitude)")},
		{name: "a column that is not there", target: "?lon_column=E", contentType: csv, body: "lon,lat\n", place: one("lon_column"), detail: one(`"E"`)},
		{name: "one column for both", target: "?lon_column=a&lat_column=a", contentType: csv, body: "a,b\n", place: one("lat_column"), detail: one("longitude and as latitude")},
		{name: "depth that is not there", target: "?depth_column=z", contentType: csv, body: "lon,lat\n", place: one("depth_column"), detail: one(`"z"`)},
		{name: "prefix of blanks", target: "?prefix=a%20b", contentType: csv, body: "lon,lat\n", place: one("prefix"), detail: one("letter")},
		{name: "unknown parameter", target: "?lat=b", contentType: csv, body: "lon,lat\n", place: one("lat"), detail: one("lat_column")},
		{name: "no such motion", target: "?motion=x", contentType: csv, body: "lon,lat\n", place: one("motion")},
		{name: "UTF-16", contentType: csv, body: "\xff\xfel\x00o\x00n\x00", place: one("line 1"), detail: one("UTF-16")},
		{name: "a picture as a table", contentType: csv, body: "\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR", place: one("line 1"), detail: one("not UTF-8")},
		{name: "an open quote", contentType: csv, body: "lon,lat,a\n1,2,x\n3,4,\"y\n5,6,z\n", place: one("line 3"), detail: one("not closed")},
		{name: "a line too long", contentType: nd, body: `{"lon":1,"x":"` + strings.Repeat("x", annotate.MaxRowBytes) + `"}`, place: one("line 1"), detail: one("longer than")},
		{name: "empty collection text", contentType: geo, place: one("line 1"), detail: one("ends too early")},
		{name: "collection cut short", contentType: geo, body: `{"type":"FeatureCollection","features":[{"type"`, place: one("line 1"), detail: one("ends too early")},
		{name: "a bare geometry", contentType: geo, body: `{"type":"Point","coordinates":[1,2]}`, place: one("#/type"), detail: one(`"Feature"`)},
		{name: "no features", contentType: geo, body: `{"type":"FeatureCollection"}`, place: one("#/type"), detail: one("features")},
		{name: "features of a Feature", contentType: geo, body: `{"type":"Feature","features":[]}`, place: one("#/type")},
		{name: "features twice", contentType: geo, body: `{"type":"FeatureCollection","features":[],"features":[]}`, place: one("#/features"), detail: one("twice")},
		{name: "features as an object", contentType: geo, body: `{"type":"FeatureCollection","features":{}}`, place: one("#/features"), detail: one("array")},
		{name: "a number as a feature", contentType: geo, body: `{"type":"FeatureCollection","features":[{"type":"Feature"},3]}`, place: one("#/features/1"), detail: one("object")},
		{name: "type is a number", contentType: geo, body: `{"type":5,"features":[]}`, place: one("#/type")},
		{name: "trailing bytes", contentType: geo, body: `{"type":"FeatureCollection","features":[]} x`, place: one("line 1"), detail: one("byte")},
		{name: "an array of features", contentType: geo, body: `[]`, place: one("line 1"), detail: one("FeatureCollection")},
		{name: "brackets without end", contentType: geo, body: strings.Repeat("[", 50000), place: one("line 1")},
		{name: "empty array text", contentType: array, place: one("line 1"), detail: one("byte 0")},
		{name: "null", contentType: array, body: "null", place: one("line 1"), detail: one("array of objects")},
		{name: "an object", contentType: array, body: `{"lon":1,"lat":2}`, place: one("line 1"), detail: one("array of objects")},
		{name: "numbers", contentType: array, body: `[{"lon":1,"lat":2},7]`, place: one("#/1"), detail: one("object")},
		{name: "trailing comma", contentType: array, body: `[{"lon":1,"lat":2},]`, place: one("line 1"), detail: one("byte 20")},
		{name: "one element too many", contentType: array, body: "[" + strings.Repeat("{},", annotate.MaxArray) + "{}]", place: one("#/1000"), detail: one("1001")},
		{name: "an array too long", contentType: array, body: "[" + strings.Repeat(" ", annotate.MaxArrayBytes) + "]", status: 413, kind: "too-large", place: one("line 1"), detail: one("NDJSON or CSV")},
		{name: "no content type", body: "lon,lat\n", status: 415, kind: "unsupported-media-type", place: one("Content-Type"), detail: one("text/csv")},
		{name: "plain text", contentType: "text/plain", body: "1 2", status: 415, kind: "unsupported-media-type", place: one("Content-Type"), detail: one("text/csv")},
		{name: "another charset", contentType: "text/csv; charset=latin1", body: "lon,lat\n", status: 415, kind: "unsupported-media-type", place: one("Content-Type"), detail: one("UTF-8")},
		{name: "a broken content type", contentType: "text/csv; charset", body: "lon,lat\n", status: 415, kind: "unsupported-media-type", place: one("Content-Type")},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.method, c.target = http.MethodPost, "/v1/annotate"+c.target
			if c.status == 0 {
				c.status, c.kind = http.StatusBadRequest, "invalid-request"
			}
			c.check(t, r)
		})
	}
}

// TestContentEncodingIsRefused: a compressed body is not read as text.
func TestContentEncodingIsRefused(t *testing.T) {
	req := httptest.NewRequest(http.MethodPost, "/v1/annotate", strings.NewReader("\x1f\x8b"))
	req.Header.Set("Content-Type", "text/csv")
	req.Header.Set("Content-Encoding", "gzip")
	w := httptest.NewRecorder()
	newRig(t).ServeHTTP(w, req)
	if p := problem(t, w); w.Code != http.StatusUnsupportedMediaType || p.Errors[0].Parameter != "Content-Encoding" {
		t.Errorf("status %d, %+v", w.Code, p)
	}
}

// TestCharsetsThatAreRead: UTF-8 under any of its names, and media types in any case.
func TestCharsetsThatAreRead(t *testing.T) {
	r := newRig(t)
	for _, ct := range []string{"text/csv; charset=utf-8", "Text/CSV;charset=UTF-8", "text/csv; header=present", "text/csv; charset=us-ascii"} {
		w := r.ask(http.MethodPost, "/v1/annotate", ct, "lon,lat\n1,2\n")
		if w.Code != http.StatusOK || w.Header().Get("Content-Type") != "text/csv" {
			t.Errorf("%s: status %d, answered as %q", ct, w.Code, w.Header().Get("Content-Type"))
		}
	}
}

// TestHead: given a path that takes GET, when asked with HEAD, expect the header
// of GET and no body.
func TestHead(t *testing.T) {
	srv := httptest.NewServer(newRig(t))
	defer srv.Close()
	for _, target := range []string{"/v1/point?lon=1&lat=2", "/v1/boundaries", "/v1/plates", "/v1/models", "/v1/models/" + testmodel.ID, "/healthz", "/readyz", "/metrics", "/openapi.json", "/v1/point?lon=x&lat=2", "/nope"} {
		get, err := http.Get(srv.URL + target)
		if err != nil {
			t.Fatal(err)
		}
		get.Body.Close()
		head, err := http.Head(srv.URL + target)
		if err != nil {
			t.Fatal(err)
		}
		body, err := io.ReadAll(head.Body)
		head.Body.Close()
		if err != nil || len(body) > 0 {
			t.Errorf("%s: a body of %d bytes, %v", target, len(body), err)
		}
		if head.StatusCode != get.StatusCode || head.Header.Get("Content-Type") != get.Header.Get("Content-Type") {
			t.Errorf("%s: HEAD gives %d %q, GET %d %q", target, head.StatusCode, head.Header.Get("Content-Type"), get.StatusCode, get.Header.Get("Content-Type"))
		}
	}
}
