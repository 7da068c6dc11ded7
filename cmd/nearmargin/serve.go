package main

import (
	"context"
	"errors"
	"log/slog"
	"net"
	"net/http"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"

	"nearmargin/api"
)

func serveFlags(f *flags) {
	f.modelFlag()
	f.set.StringVar(&f.listen, "listen", "127.0.0.1:8080", "`address` to listen on")
}

const (
	headerTimeout   = 10 * time.Second
	idleTimeout     = 2 * time.Minute
	shutdownTimeout = 15 * time.Second
	maxHeaderBytes  = 64 << 10
)

// serve answers over HTTP until the context ends.
func serve(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	log := slog.New(slog.NewJSONHandler(p.stderr, nil))
	b, err := load(f.model)
	if err != nil {
		return err
	}
	for _, x := range b.Model.Network().Faults() {
		log.Warn("fault of the boundary network", "lon", x.At.Lon, "lat", x.At.Lat, "code", x.Code, "detail", x.Detail)
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	srv := &http.Server{
		Handler:           api.New(api.Config{Models: one{b.Model}, Log: log, Registry: reg, Version: release, Commit: commit()}),
		ReadHeaderTimeout: headerTimeout,
		IdleTimeout:       idleTimeout,
		MaxHeaderBytes:    maxHeaderBytes,
		ErrorLog:          slog.NewLogLogger(log.Handler(), slog.LevelWarn),
	}
	l, err := net.Listen("tcp", f.listen)
	if err != nil {
		return err
	}
	log.Info("listening", "address", l.Addr().String(), "version", release, "commit", commit(), "model", b.Model.Ref(), "sha256", b.Model.SHA256())
	done := make(chan error, 1)
	go func() { done <- srv.Serve(l) }()
	select {
	case err := <-done:
		return err
	case <-ctx.Done():
	}
	log.Info("shutting down", "deadline", shutdownTimeout.String())
	sctx, cancel := context.WithTimeout(context.Background(), shutdownTimeout)
	defer cancel()
	if err := srv.Shutdown(sctx); err != nil {
		return errors.Join(err, srv.Close())
	}
	return nil
}
