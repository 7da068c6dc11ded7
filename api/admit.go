package api

import (
	"crypto/rand"
	"encoding/hex"
	"fmt"
	"net"
	"net/http"
	"regexp"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/access"
)

// Access says who may ask. The zero value lets everybody ask as often as they
// like, but no page of another origin.
type Access struct {
	Tokens  *access.Ring    // none needed where nil or empty
	Rate    *access.Limiter // no limit where nil
	Origins *access.Origins // none where nil
	Proxies []*net.IPNet    // whose X-Forwarded-For is believed
}

// ipExtractor returns how a client's address is found.
func (a *Access) ipExtractor() echo.IPExtractor {
	if len(a.Proxies) == 0 {
		return echo.ExtractIPDirect()
	}
	trust := []echo.TrustOption{echo.TrustLoopback(false), echo.TrustLinkLocal(false), echo.TrustPrivateNet(false)}
	for _, n := range a.Proxies {
		trust = append(trust, echo.TrustIPRange(n))
	}
	return echo.ExtractIPFromXFFHeader(trust...)
}

// The keys under which a request's id and the holder of its token are kept.
const (
	keyRequestID = "request_id"
	keyHolder    = "token"
)

var requestIDForm = regexp.MustCompile(`^[A-Za-z0-9._-]{1,64}$`)

// requestID returns the id that a request brings, or a new one where it brings
// none that is fit for a log.
func requestID(r *http.Request) string {
	if ids := r.Header.Values(echo.HeaderXRequestID); len(ids) == 1 && requestIDForm.MatchString(ids[0]) {
		return ids[0]
	}
	var b [12]byte
	rand.Read(b[:]) // never fails
	return hex.EncodeToString(b[:])
}

// requestIDOf returns the id that identify gave a request.
func requestIDOf(c echo.Context) string {
	id, _ := c.Get(keyRequestID).(string)
	return id
}

// identify gives a request its id and answers the headers that every answer has.
func identify(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		id := requestID(c.Request())
		c.Set(keyRequestID, id)
		h := c.Response().Header()
		h.Set(echo.HeaderXRequestID, id)
		h.Set(echo.HeaderXContentTypeOptions, "nosniff")
		return next(c)
	}
}

// admit lets a request pass that has the token and the allowance it needs, and
// answers browsers that ask whether they may ask.
func (s *Server) admit(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		if done := s.crossOrigin(c); done {
			return c.NoContent(http.StatusNoContent)
		}
		scope, guarded := scopes[c.Path()]
		if !guarded {
			return next(c)
		}
		client := access.ClientOf(c.RealIP())
		// a token is looked for after the allowance of the address, so that
		// guessing tokens is as slow as asking
		if err := s.allowance(c, client); err != nil {
			return err
		}
		if tokens := s.cfg.Access.Tokens.Tokens(); tokens.Len() > 0 {
			if err := s.authorise(c, tokens, scope); err != nil {
				return err
			}
		}
		return next(c)
	}
}

func (s *Server) allowance(c echo.Context, client string) error {
	if s.cfg.Access.Rate == nil {
		return nil
	}
	wait, ok := s.cfg.Access.Rate.Allow(client)
	if ok {
		return nil
	}
	s.metrics.refused.WithLabelValues(refusedRate).Inc()
	perSecond, burst := s.cfg.Access.Rate.Limits()
	detail := fmt.Sprintf("this client asks more often than it may, %g times a second and %d at once; wait for the seconds of Retry-After, or send many places at once to /v1/annotate", perSecond, burst)
	p := newProblem(http.StatusTooManyRequests, kindRate, "Too many requests", detail, FieldFault{Parameter: "client", Detail: detail})
	p.retryAfter = wait
	return p
}

// authorise looks at the bearer token (RFC 6750). It never repeats the token.
func (s *Server) authorise(c echo.Context, tokens *access.Tokens, scope access.Scope) error {
	given := c.Request().Header.Values(echo.HeaderAuthorization)
	challenge := `Bearer realm="nearmargin"`
	refuse := func(status int, kind problemKind, title, more, detail string) error {
		s.metrics.refused.WithLabelValues(string(kind)).Inc()
		c.Response().Header().Set(echo.HeaderWWWAuthenticate, challenge+more)
		return newProblem(status, kind, title, detail, FieldFault{Parameter: echo.HeaderAuthorization, Detail: detail})
	}
	const want = "send Authorization: Bearer and the token that the service's operators gave you"
	if len(given) == 0 {
		return refuse(http.StatusUnauthorized, kindToken, "A token is needed", "", "there is no token; "+want)
	}
	scheme, token, ok := strings.Cut(given[0], " ")
	if len(given) > 1 || !ok || !strings.EqualFold(scheme, "Bearer") || strings.TrimSpace(token) == "" {
		return refuse(http.StatusUnauthorized, kindToken, "A token is needed", `, error="invalid_request"`, "the header is not of the form Bearer TOKEN; "+want)
	}
	grant, ok := tokens.Find(strings.TrimSpace(token))
	if !ok {
		return refuse(http.StatusUnauthorized, kindToken, "A token is needed", `, error="invalid_token"`, "the token is not known here; "+want)
	}
	c.Set(keyHolder, grant.Name)
	if !grant.Allows(scope) {
		return refuse(http.StatusForbidden, kindScope, "The token does not allow this", `, error="insufficient_scope", scope="`+string(scope)+`"`, "the token lacks the scope "+string(scope)+"; ask the service's operators for one that has it")
	}
	return nil
}

// crossOrigin answers the headers that let a page of another origin read the
// answer. It reports whether the request was a browser's question alone.
func (s *Server) crossOrigin(c echo.Context) (preflight bool) {
	o := s.cfg.Access.Origins
	if !o.Any() {
		return false
	}
	r, h := c.Request(), c.Response().Header()
	h.Add(echo.HeaderVary, echo.HeaderOrigin)
	allow, ok := o.Allow(r.Header.Get(echo.HeaderOrigin))
	if !ok {
		return false
	}
	h.Set(echo.HeaderAccessControlAllowOrigin, allow)
	if r.Method != http.MethodOptions || r.Header.Get(echo.HeaderAccessControlRequestMethod) == "" {
		h.Set(echo.HeaderAccessControlExposeHeaders, "X-Request-Id, Retry-After, ETag")
		return false
	}
	h.Set(echo.HeaderAccessControlAllowMethods, "GET, HEAD, POST")
	h.Set(echo.HeaderAccessControlAllowHeaders, "Authorization, Content-Type, If-None-Match, X-Request-Id")
	h.Set(echo.HeaderAccessControlMaxAge, "600")
	return true
}
