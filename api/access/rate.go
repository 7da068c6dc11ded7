package access

import (
	"math"
	"net/netip"
	"sync"
	"time"

	"golang.org/x/time/rate"
)

// MaxClients is how many clients a Limiter keeps apart. The clients beyond share
// one allowance, so that its memory is bounded whatever addresses are made up.
const MaxClients = 10_000

// Limiter allows each client a number of requests a second. It counts the time that
// passes between requests, never what the clock shows: a clock that is set back
// stands still for one request, one that is set forward gives no more than a burst.
type Limiter struct {
	perSecond rate.Limit
	burst     int
	now       func() time.Time

	mu      sync.Mutex
	clients map[string]*rate.Limiter
	rest    *rate.Limiter // of the clients beyond MaxClients
	swept   time.Time
	seen    time.Time // what the clock showed at the last request
	passed  time.Time // runs with the clock, but never back
}

// NewLimiter returns a limiter. perSecond is above 0, burst at least 1; now tells
// the time, time.Now where nil.
func NewLimiter(perSecond float64, burst int, now func() time.Time) *Limiter {
	if now == nil {
		now = time.Now
	}
	start := now()
	return &Limiter{
		perSecond: rate.Limit(perSecond), burst: burst, now: now,
		clients: map[string]*rate.Limiter{}, rest: rate.NewLimiter(rate.Limit(perSecond), burst),
		seen: start, passed: start,
	}
}

// tick returns the time on the limiter's own scale.
func (l *Limiter) tick() time.Time {
	now := l.now()
	l.passed = l.passed.Add(max(0, now.Sub(l.seen)))
	l.seen = now
	return l.passed
}

// Limits tells how many requests a second each client may make, and how many at once.
func (l *Limiter) Limits() (perSecond float64, burst int) { return float64(l.perSecond), l.burst }

// Allow takes one request off a client's allowance. Where none is left it says
// how long the client is to wait, at least a second.
func (l *Limiter) Allow(client string) (wait time.Duration, ok bool) {
	l.mu.Lock()
	defer l.mu.Unlock()
	now := l.tick()
	c := l.client(client, now)
	if c.AllowN(now, 1) {
		return 0, true
	}
	seconds := math.Ceil((1 - c.TokensAt(now)) / float64(l.perSecond))
	return time.Duration(max(seconds, 1)) * time.Second, false
}

func (l *Limiter) client(name string, now time.Time) *rate.Limiter {
	if c, ok := l.clients[name]; ok {
		return c
	}
	if len(l.clients) >= MaxClients && now.Sub(l.swept) >= time.Second {
		l.swept = now
		for k, c := range l.clients {
			if c.TokensAt(now) >= float64(l.burst) { // as good as new
				delete(l.clients, k)
			}
		}
	}
	if len(l.clients) >= MaxClients {
		return l.rest
	}
	c := rate.NewLimiter(l.perSecond, l.burst)
	l.clients[name] = c
	return c
}

// ClientOf returns the name under which an address is counted: the address, or
// for IPv6 its /64, which is what one household or host is given.
func ClientOf(address string) string {
	a, err := netip.ParseAddr(address)
	if err != nil {
		return "unknown"
	}
	a = a.Unmap()
	if a.Is6() {
		p, _ := a.WithZone("").Prefix(64) // 64 fits every IPv6 address
		return p.String()
	}
	return a.String()
}
