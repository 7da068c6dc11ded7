package api

import (
	"bytes"
	"compress/gzip"
	"net/http"
	"strconv"
	"strings"
	"sync"

	"github.com/cespare/xxhash/v2"
	"github.com/labstack/echo/v4"

	"nearmargin/api/page"
)

// leastGzip is the length from which a body is compressed: below it the time that
// takes is more than that of the bytes saved on most networks.
const leastGzip = 8 << 10

// How long an answer may be kept: one for a named edition does not change, any
// other changes with the active edition and is asked about before each use. A shared
// cache may keep what was asked for without a token: nothing here says public, which
// would let it hand out answers that a token was needed for.
const (
	cacheEdition = "max-age=86400"
	cacheActive  = "no-cache"
)

// sendBytes sends a small body with its length. What GET asked for gets an entity
// tag, which a client that holds the same body already is told; a long body is
// compressed for a client that takes gzip.
func sendBytes(c echo.Context, contentType string, body []byte) error {
	r, h := c.Request(), c.Response().Header()
	h.Set(echo.HeaderContentType, contentType)
	if r.Method == http.MethodGet || r.Method == http.MethodHead {
		etag := `W/"` + strconv.FormatUint(xxhash.Sum64(body), 16) + `"`
		h.Set("ETag", etag)
		h.Set(echo.HeaderCacheControl, cacheActive)
		if strings.Contains(r.URL.RawQuery, "model=") && strings.Contains(r.URL.Query().Get("model"), "@") {
			h.Set(echo.HeaderCacheControl, cacheEdition)
		}
		if page.Matches(r.Header.Get("If-None-Match"), etag) {
			h.Del(echo.HeaderContentType)
			c.Response().WriteHeader(http.StatusNotModified)
			return nil
		}
	}
	if len(body) >= leastGzip {
		h.Add(echo.HeaderVary, echo.HeaderAcceptEncoding)
		if page.TakesGzip(r.Header.Get(echo.HeaderAcceptEncoding)) {
			packed, err := pack(body)
			if err != nil {
				return err
			}
			body = packed
			h.Set(echo.HeaderContentEncoding, "gzip")
		}
	}
	h.Set(echo.HeaderContentLength, strconv.Itoa(len(body)))
	c.Response().WriteHeader(http.StatusOK)
	_, err := c.Response().Write(body)
	return err
}

// packers keeps compressors, which are large.
var packers = sync.Pool{New: func() any { return gzip.NewWriter(nil) }}

func pack(body []byte) ([]byte, error) {
	var b bytes.Buffer
	z := packers.Get().(*gzip.Writer)
	defer packers.Put(z)
	z.Reset(&b)
	if _, err := z.Write(body); err != nil {
		return nil, err
	}
	if err := z.Close(); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}
