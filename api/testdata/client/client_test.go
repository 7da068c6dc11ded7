// Package client_test uses a client generated from the OpenAPI document against the
// service at NEARMARGIN_URL. The tests of package api generate it and run this.
package client_test

import (
	"bytes"
	"encoding/json"
	"net/http"
	"os"
	"reflect"
	"strings"
	"testing"

	"github.com/speakeasy-api/openapi/openapi"

	"example.org/client/nearmargin"
)

// TestDocument validates the document against OpenAPI 3.1 with another implementation.
func TestDocument(t *testing.T) {
	f, err := os.Open("openapi.json")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	doc, faults, err := openapi.Unmarshal(t.Context(), f)
	if err != nil {
		t.Fatal(err)
	}
	for _, fault := range faults {
		t.Error(fault)
	}
	if doc.OpenAPI != "3.1.0" || doc.Paths.Len() < 15 {
		t.Errorf("read as OpenAPI %s with %d paths", doc.OpenAPI, doc.Paths.Len())
	}
}

func newClient(t *testing.T) *nearmargin.ClientWithResponses {
	t.Helper()
	c, err := nearmargin.NewClientWithResponses(os.Getenv("NEARMARGIN_URL"))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// whole checks that nothing of a body was lost or changed on its way into a value.
func whole(t *testing.T, status int, body []byte, value any) {
	t.Helper()
	if status != http.StatusOK || reflect.ValueOf(value).IsNil() {
		t.Fatalf("status %d, value %v: %s", status, value, body)
	}
	raw, err := json.Marshal(value)
	if err != nil {
		t.Fatal(err)
	}
	var want, got any
	for text, v := range map[*any][]byte{&want: body, &got: raw} {
		if err := json.Unmarshal(v, text); err != nil {
			t.Fatal(err)
		}
	}
	if !reflect.DeepEqual(want, got) {
		t.Errorf("the client reads\n%s\nof\n%s", raw, body)
	}
}

func ptr[T any](v T) *T { return &v }

func TestPoint(t *testing.T) {
	c := newClient(t)
	for _, p := range []nearmargin.PointParams{
		{Lon: -72.4, Lat: -36.1, DepthKm: ptr(25.0), UncertaintyKm: ptr(5.0)},
		{Lon: 179.99999999, Lat: -17.25},
		{Lon: -90, Lat: 20, AgeMa: ptr(120.0)},
		{Lon: 10, Lat: 90, Motion: ptr("pb2002")},
	} {
		r, err := c.PointWithResponse(t.Context(), &p)
		if err != nil {
			t.Fatal(err)
		}
		whole(t, r.StatusCode(), r.Body, r.JSON200)
		if r.JSON200.Site.Lat != p.Lat {
			t.Errorf("asked for %v, answered for %v", p, r.JSON200.Site)
		}
	}
	r, err := c.PointWithResponse(t.Context(), &nearmargin.PointParams{Lon: -72.4, Lat: -36.1})
	if err != nil {
		t.Fatal(err)
	}
	a := r.JSON200
	if a.Setting.Label != nearmargin.LabelForearc || a.Setting.Family != nearmargin.FamilySubduction || a.NearestBoundary.RelativeMotion == nil || a.Site.DepthKm != nil || len(a.Slabs) == 0 || a.Slabs[0].SiteRelation != nil {
		t.Errorf("read %+v", a)
	}
	// an answer that the client holds is not sent again
	etag := r.HTTPResponse.Header.Get("ETag")
	r, err = c.PointWithResponse(t.Context(), &nearmargin.PointParams{Lon: -72.4, Lat: -36.1, IfNoneMatch: &etag})
	if err != nil || r.StatusCode() != http.StatusNotModified || len(r.Body) > 0 {
		t.Errorf("status %d, error %v", r.StatusCode(), err)
	}
}

func TestProblem(t *testing.T) {
	r, err := newClient(t).PointWithResponse(t.Context(), &nearmargin.PointParams{Lon: 1, Lat: 95})
	if err != nil {
		t.Fatal(err)
	}
	p := r.ApplicationproblemJSON400
	if r.JSON200 != nil || p == nil || p.Type != nearmargin.UrnNearmarginProblemInvalidRequest || p.Errors == nil || len(*p.Errors) != 1 || *(*p.Errors)[0].Parameter != "lat" {
		t.Errorf("status %d, problem %+v: %s", r.StatusCode(), p, r.Body)
	}
}

func TestArea(t *testing.T) {
	c := newClient(t)
	box, err := c.AreaOfBoxWithResponse(t.Context(), &nearmargin.AreaOfBoxParams{Bbox: "-76,-40,-68,-30"})
	if err != nil {
		t.Fatal(err)
	}
	whole(t, box.StatusCode(), box.Body, box.JSON200)
	var area nearmargin.AreaRequest
	if err := area.FromPolygonRequest(nearmargin.PolygonRequest{
		Type:        nearmargin.PolygonRequestTypePolygon,
		Coordinates: []nearmargin.RingRequest{{{170, -45}, {-175, -45}, {-175, -35}, {170, -35}, {170, -45}}},
	}); err != nil {
		t.Fatal(err)
	}
	r, err := c.AreaWithResponse(t.Context(), &nearmargin.AreaParams{}, area)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, r.StatusCode(), r.Body, r.JSON200)
	if len(r.JSON200.BoundariesInside) == 0 || r.JSON200.NearestBoundary.DistanceKm != 0 {
		t.Errorf("read %+v", r.JSON200)
	}
}

func TestModel(t *testing.T) {
	c := newClient(t)
	models, err := c.ModelsWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, models.StatusCode(), models.Body, models.JSON200)
	m := models.JSON200.Models[0]
	one, err := c.ModelWithResponse(t.Context(), m.Id+"@"+m.Edition, nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, one.StatusCode(), one.Body, one.JSON200)
	plates, err := c.PlatesWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, plates.StatusCode(), plates.Body, plates.JSON200)
	ready, err := c.ReadyzWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, ready.StatusCode(), ready.Body, ready.JSON200)
	boundaries, err := c.BoundariesWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, boundaries.StatusCode(), boundaries.Body, boundaries.ApplicationgeoJSON200)
	cut := 0
	for _, f := range boundaries.ApplicationgeoJSON200.Features {
		if g, err := f.Geometry.AsMultiLineString(); err == nil && g.Type == nearmargin.MultiLineStringTypeMultiLineString {
			cut++
		}
	}
	if cut == 0 {
		t.Error("no boundary crosses the antimeridian")
	}
	slabs, err := c.SlabsWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, slabs.StatusCode(), slabs.Body, slabs.ApplicationgeoJSON200)
	zones, err := c.ZonesWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, zones.StatusCode(), zones.Body, zones.ApplicationgeoJSON200)
	hotspots, err := c.HotspotsWithResponse(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, hotspots.StatusCode(), hotspots.Body, hotspots.ApplicationgeoJSON200)
}

func TestSection(t *testing.T) {
	r, err := newClient(t).SectionWithResponse(t.Context(), &nearmargin.SectionParams{Lon: -72.4, Lat: -36.1})
	if err != nil {
		t.Fatal(err)
	}
	whole(t, r.StatusCode(), r.Body, r.JSON200)
}

func TestAnnotate(t *testing.T) {
	c := newClient(t)
	rows := nearmargin.AnnotateJSONRequestBody{{"site": "A-001", "lon": -72.4, "lat": -36.1}, {"site": "A-002"}}
	r, err := c.AnnotateWithResponse(t.Context(), &nearmargin.AnnotateParams{}, rows)
	if err != nil {
		t.Fatal(err)
	}
	whole(t, r.StatusCode(), r.Body, r.JSON200)
	if len(*r.JSON200) != 2 {
		t.Fatalf("%d objects: %s", len(*r.JSON200), r.Body)
	}
	first, err := (*r.JSON200)[0].AsAnnotatedObject()
	if err != nil || first.Tectonic == nil || first.AdditionalProperties["site"] != "A-001" {
		t.Fatalf("%v: %+v", err, first)
	}
	if a, err := first.Tectonic.AsAnswer(); err != nil || a.Setting.Label != nearmargin.LabelForearc {
		t.Errorf("%v: %+v", err, a)
	}
	second, err := (*r.JSON200)[1].AsAnnotatedObject()
	if err != nil || second.TectonicError == nil {
		t.Errorf("%v: %+v", err, second)
	}
	// a table of any length goes as a stream
	raw, err := c.AnnotateWithBody(t.Context(), &nearmargin.AnnotateParams{Prefix: ptr("t_")}, "text/csv", strings.NewReader("lon,lat\n-72.4,-36.1\n"))
	if err != nil {
		t.Fatal(err)
	}
	defer raw.Body.Close()
	var out bytes.Buffer
	if _, err := out.ReadFrom(raw.Body); err != nil || raw.StatusCode != http.StatusOK {
		t.Fatalf("status %d, error %v", raw.StatusCode, err)
	}
	if !strings.HasPrefix(out.String(), "lon,lat,t_plate,") || !strings.Contains(out.String(), ",forearc,") || raw.Trailer.Get("Nearmargin-Rows") != "1" {
		t.Errorf("trailers %v: %s", raw.Trailer, &out)
	}
}
