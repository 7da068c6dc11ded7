package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"log/slog"
	"math"
	"net"
	"os"
	"slices"
	"strings"
	"time"

	"nearmargin/api"
	"nearmargin/api/access"
)

// serveConfig is how the service is set up, but for the model.
type serveConfig struct {
	privateListen string
	pprof         bool
	basePath      string
	checkOnly     bool

	headerTime, writeTime, idleTime time.Duration
	drainTime, shutdownTime         time.Duration
	limits                          api.Limits

	tokens, tokensFile      string
	rate                    float64
	burst                   int
	origins, trustedProxies string
}

// operationFlags declares the flags of limits, access and operation.
func (f *flags) operationFlags() {
	c, s := &f.serving, f.set
	d := api.DefaultLimits
	s.DurationVar(&c.headerTime, "header-timeout", 10*time.Second, "`time` for a request's header to arrive")
	s.DurationVar(&c.limits.ReadTime, "read-timeout", d.ReadTime, "`time` for a whole request to arrive that is not a batch")
	s.DurationVar(&c.writeTime, "write-timeout", time.Minute, "`time` for an answer that is not a batch's, from the end of the request's header")
	s.DurationVar(&c.idleTime, "idle-timeout", 2*time.Minute, "`time` that a connection may lie idle between requests")
	s.DurationVar(&c.limits.StallTime, "stall-timeout", d.StallTime, "`time` that a batch waits for its client to send 1 KiB or to take what was written")
	s.DurationVar(&c.limits.BatchTime, "batch-timeout", d.BatchTime, "`time` for a whole batch")
	s.DurationVar(&c.drainTime, "drain-time", 0, "`time` from SIGTERM, with readiness off, until no connection is taken any more")
	s.DurationVar(&c.shutdownTime, "shutdown-timeout", 15*time.Second, "`time` after that for running batches to finish; then they are cut short")
	s.IntVar(&c.limits.HeaderBytes, "max-header-bytes", d.HeaderBytes, "`bytes` of a request's line and header")
	s.Int64Var(&c.limits.BodyBytes, "max-body-bytes", d.BodyBytes, "`bytes` of an area or a JSON array")
	s.IntVar(&c.limits.RowBytes, "max-row-bytes", d.RowBytes, "`bytes` of a row, line or feature of a batch")
	s.IntVar(&c.limits.Batches, "max-batches", d.Batches, "`number` of batches at once; those beyond get 503")
	s.IntVar(&c.limits.Areas, "max-areas", d.Areas, "`number` of areas that are worked on or wait; those beyond get 503")
	s.StringVar(&c.privateListen, "private-listen", "", "private `address` for metrics, health and pprof; metrics are on the public one where empty")
	s.BoolVar(&c.pprof, "pprof", false, "serve profiles on the private address")
	s.StringVar(&c.basePath, "base-path", "", "`path` below which a proxy shows the service, such as /tectonics")
	s.StringVar(&c.tokens, "tokens", "", "`list` of tokens as NAME SCOPES SHA256, separated by semicolons; none needed where there are none")
	s.StringVar(&c.tokensFile, "tokens-file", "", "`file` of tokens in the same form, one a line")
	s.Float64Var(&c.rate, "rate", 0, "`requests` a second that each client may make; 0: no limit")
	s.IntVar(&c.burst, "rate-burst", 50, "`requests` that a client may make at once")
	s.StringVar(&c.origins, "cors-origins", "", "`origins` whose pages may ask, separated by commas; * for all")
	s.StringVar(&c.trustedProxies, "trusted-proxies", "", "`networks` of proxies whose X-Forwarded-For is believed, separated by commas")
	s.BoolVar(&c.checkOnly, "check-config", false, "print the configuration in effect and exit")
}

// validate checks every setting, reports every fault, and returns what the API
// needs of it.
func (c *serveConfig) validate() (api.Access, error) {
	var a api.Access
	var errs []error
	fail := func(err error) {
		if err != nil {
			errs = append(errs, err)
		}
	}
	for _, x := range []struct {
		name      string
		d         time.Duration
		low, high time.Duration
	}{
		{"header-timeout", c.headerTime, time.Second, 10 * time.Minute},
		{"write-timeout", c.writeTime, time.Second, time.Hour},
		{"idle-timeout", c.idleTime, time.Second, time.Hour},
		{"drain-time", c.drainTime, 0, 10 * time.Minute},
		{"shutdown-timeout", c.shutdownTime, time.Second, 24 * time.Hour},
	} {
		if x.d < x.low || x.d > x.high {
			fail(fmt.Errorf("--%s is %v; want %v to %v", x.name, x.d, x.low, x.high))
		}
	}
	if c.headerTime > c.limits.ReadTime {
		fail(fmt.Errorf("--header-timeout is %v and --read-timeout %v; the header is a part of the request, so it must not be the longer", c.headerTime, c.limits.ReadTime))
	}
	if err := c.limits.Validate(); err != nil {
		for _, e := range strings.Split(err.Error(), "\n") {
			fail(errors.New("--" + e))
		}
	}
	fail(api.CheckBasePath(c.basePath))
	if c.privateListen != "" {
		if _, _, err := net.SplitHostPort(c.privateListen); err != nil {
			fail(fmt.Errorf("--private-listen: %w; want host:port, such as 127.0.0.1:9090", err))
		}
	}
	if c.pprof && c.privateListen == "" {
		fail(errors.New("--pprof needs --private-listen; profiles are never served on the public address"))
	}
	if math.IsNaN(c.rate) || c.rate < 0 || c.rate > 1e6 {
		fail(fmt.Errorf("--rate is %g; want 0 to 1000000 requests a second", c.rate))
	}
	if c.burst < 1 || c.burst > 1e6 {
		fail(fmt.Errorf("--rate-burst is %d; want 1 to 1000000 requests", c.burst))
	}
	tokens, err := c.readTokens()
	fail(err)
	a.Tokens = access.NewRing(tokens)
	a.Origins, err = access.ParseOrigins(c.origins)
	fail(err)
	a.Proxies, err = access.ParseProxies(c.trustedProxies)
	fail(err)
	if len(errs) > 0 {
		return api.Access{}, usageError("%v", errors.Join(errs...))
	}
	if c.rate > 0 {
		a.Rate = access.NewLimiter(c.rate, c.burst, nil)
	}
	return a, nil
}

// readTokens puts the tokens of the flag and of the file together. A file
// without a token is a fault: it would open the service to all.
func (c *serveConfig) readTokens() (*access.Tokens, error) {
	text := c.tokens
	if c.tokensFile != "" {
		raw, err := os.ReadFile(c.tokensFile) // #nosec G703 -- the operator's own path
		if err != nil {
			return nil, fmt.Errorf("--tokens-file: %w", err)
		}
		text = string(raw) + "\n" + text
	}
	t, err := access.ParseTokens(text)
	if err != nil {
		return nil, err
	}
	if t.Len() == 0 && (c.tokensFile != "" || c.tokens != "") {
		return nil, errors.New("tokens: there is none in what was given, which would let everybody in; leave --tokens and --tokens-file out for that")
	}
	return t, nil
}

// reloadTokens reads the tokens again. A file that is at fault leaves the old ones
// valid: neither is everybody let in, nor everybody shut out.
func (c *serveConfig) reloadTokens(ring *access.Ring, log *slog.Logger) {
	if c.tokensFile == "" {
		return // those of the flag cannot have changed
	}
	t, err := c.readTokens()
	if err != nil {
		log.Error("the tokens were not reloaded; the old ones stay", "error", err, "tokens", ring.Tokens().Len())
		return
	}
	before := ring.Tokens().Len()
	ring.Replace(t)
	log.Info("the tokens were reloaded", "tokens", t.Len(), "before", before)
}

// secretFlags are not shown: what stands in them opens something, or helps to.
var secretFlags = []string{"tokens", "database"}

// print writes the configuration in effect as an environment file.
func (f *flags) printConfig(w io.Writer) {
	f.set.VisitAll(func(fl *flag.Flag) {
		value := fl.Value.String()
		switch {
		case fl.Name == "check-config":
			return
		case value != "" && slices.Contains(secretFlags, fl.Name):
			fmt.Fprintf(w, "# %s is given and not shown\n", envName(fl.Name))
			return
		}
		fmt.Fprintf(w, "%s=%s\n", envName(fl.Name), value)
	})
}
