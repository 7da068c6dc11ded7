package api

import (
	"fmt"
	"net/http"
	"net/url"
	"regexp"
	"slices"
	"strings"
)

var basePathForm = regexp.MustCompile(`^(/[A-Za-z0-9._~-]+)+$`)

// CheckBasePath says what is wrong with the path below which a service stands.
func CheckBasePath(base string) error {
	if base == "" {
		return nil
	}
	if !basePathForm.MatchString(base) || slices.ContainsFunc(strings.Split(base, "/"), func(s string) bool { return s == "." || s == ".." }) {
		return fmt.Errorf("base path %.80q must be of the form /maps/tectonics: a slash before each part, none at the end", base)
	}
	return nil
}

// atRoot are the paths that are answered without the base path too, for probes
// and scrapers that come without the proxy.
var atRoot = []string{"/healthz", "/readyz", "/metrics"}

// stripBase takes the base path off a request. A path outside of it becomes one
// where there is nothing.
func stripBase(base string, r *http.Request) *http.Request {
	if base == "" || slices.Contains(atRoot, r.URL.Path) {
		return r
	}
	to := "/"
	rest, inside := strings.CutPrefix(r.URL.Path, base)
	raw, rawInside := strings.CutPrefix(r.URL.RawPath, base)
	inside = inside && (rest == "" || rest[0] == '/') && (r.URL.RawPath == "" || rawInside)
	if rest != "" {
		to = rest
	}
	r2 := r.Clone(r.Context())
	r2.URL = &url.URL{}
	*r2.URL = *r.URL
	if !inside {
		r2.URL.Path, r2.URL.RawPath = "/-outside-"+base, ""
		return r2
	}
	r2.URL.Path, r2.URL.RawPath = to, raw
	return r2
}
