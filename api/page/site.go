package page

import (
	"bytes"
	"compress/gzip"
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"fmt"
	"io/fs"
	"maps"
	"net/http"
	"path"
	"strconv"
	"strings"
	"sync"
)

//go:embed static
var static embed.FS

//go:embed template
var templates embed.FS

// contentTypes are the types of the files, by the ending of their names.
var contentTypes = map[string]string{
	".html":    "text/html; charset=utf-8",
	".css":     "text/css; charset=utf-8",
	".js":      "text/javascript; charset=utf-8",
	".json":    "application/json",
	".svg":     "image/svg+xml",
	".LICENSE": "text/plain; charset=utf-8",
}

// ContentSecurityPolicy is what a page may load: its own files from its own host.
// It has no exception for scripts or styles within the page, for evaluation, or
// for data in addresses.
const ContentSecurityPolicy = "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; " +
	"base-uri 'none'; form-action 'none'; frame-ancestors 'none'"

// File is one file of a site, ready to be sent.
type File struct {
	ContentType string
	ETag        string
	Plain       []byte
	// packed returns the body in gzip's form, nil where that gains nothing. It is made when
	// it is first asked for: packing all files would take half of the program's start.
	packed func() []byte
}

// newFile prepares a file. The name's ending gives its type.
func newFile(name string, body []byte) (*File, error) {
	kind, ok := contentTypes[path.Ext(name)]
	if !ok {
		return nil, fmt.Errorf("page: %s: the ending names no content type", name)
	}
	sum := sha256.Sum256(body)
	f := &File{ContentType: kind, ETag: `"` + hex.EncodeToString(sum[:12]) + `"`, Plain: body}
	f.packed = sync.OnceValue(func() []byte { return pack(body) })
	return f, nil
}

// pack returns a body in gzip's form, nil where that gains nothing.
func pack(body []byte) []byte {
	var b bytes.Buffer
	z, _ := gzip.NewWriterLevel(&b, gzip.BestCompression) // the level is a constant and valid
	_, _ = z.Write(body)                                  // a buffer takes everything
	_ = z.Close()                                         // as above
	if b.Len() >= len(body)*9/10 {
		return nil
	}
	return b.Bytes()
}

// Site is all pages and the files that they load. It is immutable.
type Site struct{ files map[string]*File }

// staticFiles are the files of the program's own by their paths, prepared once.
var staticFiles = sync.OnceValues(func() (map[string]*File, error) {
	files := map[string]*File{}
	err := fs.WalkDir(static, "static", func(name string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		body, err := static.ReadFile(name)
		if err != nil {
			return err
		}
		at := "/assets/" + strings.TrimPrefix(name, "static/")
		if at == "/assets/index.html" {
			at = "/"
		}
		files[at], err = newFile(name, body)
		return err
	})
	return files, err
})

// New builds a site: the map page at "/", the reference page at "/reference", made
// from an OpenAPI document, and the files below "/assets/".
func New(openapi []byte) (*Site, error) {
	files, err := staticFiles()
	if err != nil {
		return nil, err
	}
	html, err := reference(openapi)
	if err != nil {
		return nil, err
	}
	s := &Site{files: maps.Clone(files)}
	s.files["/reference"], err = newFile("reference.html", html)
	return s, err
}

// Find returns the file at a path.
func (s *Site) Find(at string) (*File, bool) {
	f, ok := s.files[at]
	return f, ok
}

// Weight returns the number of bytes of the files at the paths: as they are, and as
// they are sent to a browser that takes gzip.
func (s *Site) Weight(paths ...string) (plain, sent int) {
	for _, p := range paths {
		f := s.files[p]
		plain += len(f.Plain)
		sent += len(f.Plain)
		if z := f.packed(); z != nil {
			sent += len(z) - len(f.Plain)
		}
	}
	return plain, sent
}

// ServeHTTP sends the file. A browser that holds it already is told so.
func (f *File) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	h := w.Header()
	h.Set("ETag", f.ETag)
	h.Set("Cache-Control", "no-cache") // kept, and asked about before each use
	h.Add("Vary", "Accept-Encoding")
	h.Set("X-Content-Type-Options", "nosniff")
	h.Set("Referrer-Policy", "no-referrer")
	h.Set("Content-Security-Policy", ContentSecurityPolicy)
	if Matches(r.Header.Get("If-None-Match"), f.ETag) {
		w.WriteHeader(http.StatusNotModified)
		return
	}
	body := f.Plain
	if TakesGzip(r.Header.Get("Accept-Encoding")) {
		if z := f.packed(); z != nil {
			body = z
			h.Set("Content-Encoding", "gzip")
		}
	}
	h.Set("Content-Type", f.ContentType)
	h.Set("Content-Length", strconv.Itoa(len(body)))
	w.WriteHeader(http.StatusOK)
	if r.Method != http.MethodHead {
		_, _ = w.Write(body) // the client has gone
	}
}

// Matches reports whether an If-None-Match header names an entity tag, by the weak
// comparison of RFC 9110, section 8.8.3.2.
func Matches(header, etag string) bool {
	for part := range strings.SplitSeq(header, ",") {
		if t := strings.TrimSpace(part); t == "*" || t != "" && strings.TrimPrefix(t, "W/") == strings.TrimPrefix(etag, "W/") {
			return true
		}
	}
	return false
}

// TakesGzip reports whether an Accept-Encoding header takes gzip by its name.
func TakesGzip(header string) bool {
	for part := range strings.SplitSeq(header, ",") {
		coding, weight, _ := strings.Cut(strings.ToLower(part), ";")
		if strings.TrimSpace(coding) != "gzip" {
			continue
		}
		q, err := strconv.ParseFloat(strings.TrimPrefix(strings.TrimSpace(weight), "q="), 64)
		return strings.TrimSpace(weight) == "" || err == nil && q > 0
	}
	return false
}
