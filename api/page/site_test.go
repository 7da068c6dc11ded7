package page_test

import (
	"bytes"
	"compress/gzip"
	"html"
	"io"
	"net/http"
	"net/http/httptest"
	"regexp"
	"strings"
	"testing"

	"nearmargin/api"
	"nearmargin/api/page"
)

func newSite(t *testing.T) *page.Site {
	t.Helper()
	s, err := page.New(api.OpenAPI())
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func get(t *testing.T, s *page.Site, path string, header map[string]string) *httptest.ResponseRecorder {
	t.Helper()
	f, ok := s.Find(path)
	if !ok {
		t.Fatalf("there is nothing at %s", path)
	}
	r := httptest.NewRequest(http.MethodGet, path, nil)
	for k, v := range header {
		r.Header.Set(k, v)
	}
	w := httptest.NewRecorder()
	f.ServeHTTP(w, r)
	return w
}

// TestPolicyHasNoExceptions: scripts and styles come from files of the same host
// alone, and the pages hold none themselves.
func TestPolicyHasNoExceptions(t *testing.T) {
	s := newSite(t)
	for _, path := range []string{"/", "/reference"} {
		w := get(t, s, path, nil)
		policy := w.Header().Get("Content-Security-Policy")
		if !strings.HasPrefix(policy, "default-src 'none'; script-src 'self'; style-src 'self';") {
			t.Errorf("%s: the policy is %q", path, policy)
		}
		if m := regexp.MustCompile(`unsafe|nonce|sha256|data:|blob:|https?:|\*`).FindString(policy); m != "" {
			t.Errorf("%s: the policy has the exception %q", path, m)
		}
		if w.Header().Get("X-Content-Type-Options") != "nosniff" {
			t.Errorf("%s may be sniffed", path)
		}
		html := w.Body.String()
		for what, re := range map[string]string{
			"a script within": `<script(?:\s[^>]*)?>[^<]`, "a style within": `<style`, "a style attribute": `\sstyle=`,
			"a handler attribute": `\son[a-z]+=`, "another host": `(?:src|href)="(?:https?:)?//`, "an address that no base path suits": `(?:src|href)="/`,
		} {
			if m := regexp.MustCompile(re).FindString(html); m != "" {
				t.Errorf("%s holds %s: %q", path, what, m)
			}
		}
	}
}

// TestEntityTags: a browser that has a file is told so, and one that takes gzip gets
// the same bytes packed.
func TestEntityTags(t *testing.T) {
	s := newSite(t)
	for _, path := range []string{"/", "/reference", "/assets/app.js", "/assets/style.css", "/assets/vendor/d3.min.js", "/assets/vendor/land-110m.json", "/assets/vendor/d3.LICENSE"} {
		w := get(t, s, path, nil)
		tag := w.Header().Get("ETag")
		if w.Code != 200 || tag == "" || w.Header().Get("Cache-Control") != "no-cache" {
			t.Errorf("%s: status %d, header %v", path, w.Code, w.Header())
		}
		if again := get(t, s, path, map[string]string{"If-None-Match": tag}); again.Code != 304 || again.Body.Len() != 0 {
			t.Errorf("%s: asked again: status %d, %d bytes", path, again.Code, again.Body.Len())
		}
		if other := get(t, s, path, map[string]string{"If-None-Match": `"another"`}); other.Code != 200 {
			t.Errorf("%s: with another tag: status %d", path, other.Code)
		}
		packed := get(t, s, path, map[string]string{"Accept-Encoding": "br, gzip"})
		if packed.Header().Get("Content-Encoding") != "gzip" {
			if w.Body.Len() > 4096 {
				t.Errorf("%s, %d bytes, is not packed", path, w.Body.Len())
			}
			continue
		}
		z, err := gzip.NewReader(packed.Body)
		if err != nil {
			t.Fatal(err)
		}
		if plain, err := io.ReadAll(z); err != nil || !bytes.Equal(plain, w.Body.Bytes()) {
			t.Errorf("%s: unpacked it differs (%v)", path, err)
		}
	}
	if _, ok := s.Find("/assets/nothing"); ok {
		t.Error("there is something at /assets/nothing")
	}
}

// firstPaint are the files that the page needs before it gives an answer.
var firstPaint = []string{"/", "/assets/style.css", "/assets/vendor/d3.min.js", "/assets/vendor/topojson-client.min.js", "/assets/app.js", "/assets/answer.js",
	"/assets/area.js", "/assets/codec.js", "/assets/coords.js", "/assets/dom.js", "/assets/files.js", "/assets/globe.js", "/assets/input.js", "/assets/legend.js", "/assets/overlay.js",
	"/assets/paste.js", "/assets/plates.js", "/assets/service.js", "/assets/state.js", "/assets/symbols.js", "/assets/token.js", "/assets/vendor/land-110m.json"}

// TestPageWeight keeps the README's statement of the page's weight true.
func TestPageWeight(t *testing.T) {
	plain, sent := newSite(t).Weight(firstPaint...)
	t.Logf("%d bytes, %d as sent", plain, sent)
	if sent > 170_000 {
		t.Errorf("the page weighs %d bytes as sent; the README says at most 170 kB", sent)
	}
}

func TestNegotiation(t *testing.T) {
	for _, c := range []struct {
		header string
		want   bool
	}{{"gzip", true}, {"br, gzip;q=0.5", true}, {"GZIP", true}, {"gzip;q=0", false}, {"", false}, {"br", false}, {"gzip;q=x", false}} {
		if got := page.TakesGzip(c.header); got != c.want {
			t.Errorf("Accept-Encoding %q: %v", c.header, got)
		}
	}
	for _, c := range []struct {
		header string
		want   bool
	}{{`"a"`, true}, {`W/"a"`, true}, {`"b", "a"`, true}, {"*", true}, {`"b"`, false}, {"", false}} {
		if got := page.Matches(c.header, `"a"`); got != c.want {
			t.Errorf("If-None-Match %q: %v", c.header, got)
		}
	}
}

// TestReferenceIsComplete: the page names every operation, parameter, schema and
// member of the document, and its links lead somewhere.
func TestReferenceIsComplete(t *testing.T) {
	page := html.UnescapeString(get(t, newSite(t), "/reference", nil).Body.String())
	doc := string(api.OpenAPI())
	for _, m := range regexp.MustCompile(`"operationId": "(\w+)"`).FindAllStringSubmatch(doc, -1) {
		if !strings.Contains(page, `<article id="`+m[1]+`">`) {
			t.Errorf("the page lacks the operation %s", m[1])
		}
	}
	refs := regexp.MustCompile(`#/components/schemas/(\w+)`).FindAllStringSubmatch(doc, -1)
	if len(refs) < 50 {
		t.Fatalf("the document has %d references", len(refs))
	}
	for _, m := range refs {
		if !strings.Contains(page, `id="schema-`+m[1]+`"`) {
			t.Errorf("the page lacks the schema %s", m[1])
		}
	}
	for _, want := range []string{"/v1/point", "uncertainty_km", "boundary_azimuth_deg", "application/problem+json", "PRESENT DAY", "SCREENING AID", "outer_rise"} {
		if !strings.Contains(page, want) {
			t.Errorf("the page lacks %q", want)
		}
	}
	for _, m := range regexp.MustCompile(`href="#([^"]+)"`).FindAllStringSubmatch(page, -1) {
		if !strings.Contains(page, `id="`+m[1]+`"`) {
			t.Errorf("the link to #%s leads nowhere", m[1])
		}
	}
}
