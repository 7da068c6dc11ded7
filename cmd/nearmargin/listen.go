package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"net/http/pprof"
	"time"

	"nearmargin/api"
)

// listenAndServe answers on the public address and, where there is one, on the
// private address, until the context ends; then it shuts down in order. ready is
// called with the public address once both listen.
func (c *serveConfig) listenAndServe(ctx context.Context, log *slog.Logger, public string, h *api.Server, ready func(address string)) error {
	base, giveUp := context.WithCancelCause(context.WithoutCancel(ctx))
	defer giveUp(nil)
	srv := c.server(h, log)
	srv.BaseContext = func(net.Listener) context.Context { return base }
	l, err := net.Listen("tcp", public)
	if err != nil {
		return err
	}
	done := make(chan error, 2)
	if c.privateListen != "" {
		pl, err := net.Listen("tcp", c.privateListen)
		if err != nil {
			return errors.Join(err, l.Close())
		}
		private := c.server(c.private(h), log)
		if c.pprof {
			private.WriteTimeout = 10 * time.Minute // a profile takes as long as it is asked to
		}
		defer private.Close() // last: metrics are to be seen while batches finish
		log.Info("listening on the private address", "address", pl.Addr().String(), "pprof", c.pprof)
		go func() { done <- private.Serve(api.Listener(pl, c.limits.HeaderBytes)) }()
	}
	ready(l.Addr().String())
	go func() { done <- srv.Serve(api.Listener(l, c.limits.HeaderBytes)) }()
	select {
	case err := <-done:
		return errors.Join(err, srv.Close())
	case <-ctx.Done():
	}
	return c.shutDown(log, srv, h, giveUp)
}

// server is an HTTP server with every timeout set.
func (c *serveConfig) server(h http.Handler, log *slog.Logger) *http.Server {
	return &http.Server{
		Handler:                      h,
		ReadHeaderTimeout:            c.headerTime,
		ReadTimeout:                  c.limits.ReadTime,
		WriteTimeout:                 c.writeTime,
		IdleTimeout:                  c.idleTime,
		MaxHeaderBytes:               c.limits.HeaderBytes,
		DisableGeneralOptionsHandler: true,
		ErrorLog:                     slog.NewLogLogger(log.Handler(), slog.LevelWarn),
	}
}

// private serves what is for operations alone.
func (c *serveConfig) private(h *api.Server) http.Handler {
	mux := http.NewServeMux()
	mux.Handle("GET /metrics", h.Metrics())
	mux.Handle("GET /healthz", h)
	mux.Handle("GET /readyz", h)
	if c.pprof {
		mux.HandleFunc("GET /debug/pprof/", pprof.Index)
		mux.HandleFunc("GET /debug/pprof/cmdline", pprof.Cmdline)
		mux.HandleFunc("GET /debug/pprof/profile", pprof.Profile)
		mux.HandleFunc("GET /debug/pprof/symbol", pprof.Symbol)
		mux.HandleFunc("GET /debug/pprof/trace", pprof.Trace)
	}
	return mux
}

// cutTime is how long batches that are given up have to notice it.
const cutTime = time.Second

// shutDown takes the service out of use: first readiness goes off and new
// batches are refused, while proxies notice; then no connection is taken any
// more and running requests finish; what runs at the deadline is cut short.
func (c *serveConfig) shutDown(log *slog.Logger, srv *http.Server, h *api.Server, giveUp context.CancelCauseFunc) error {
	h.Drain()
	log.Info("shutting down", "drain", c.drainTime.String(), "deadline", c.shutdownTime.String(), "batches", h.BatchesRunning())
	time.Sleep(c.drainTime)
	ctx, cancel := context.WithTimeout(context.Background(), c.shutdownTime)
	defer cancel()
	err := srv.Shutdown(ctx)
	if !errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	left := h.BatchesRunning()
	giveUp(api.ErrShutdown)
	ctx, cancel = context.WithTimeout(context.Background(), cutTime)
	defer cancel()
	if srv.Shutdown(ctx) != nil { // some wait for their clients
		_ = srv.Close() // nothing is left to be done about it
	}
	return fmt.Errorf("after %v still %d batches ran and were cut short", c.shutdownTime, left)
}
