package main

import (
	"context"
	"errors"
	"log/slog"
	"net"
	"net/http"
	"os"
	"os/signal"
	"sync"
	"syscall"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"

	"nearmargin/api"
	"nearmargin/store"
)

func serveFlags(f *flags) {
	f.modelFlag()
	f.set.StringVar(&f.listen, "listen", "127.0.0.1:8080", "`address` to listen on")
	f.databaseFlag("serve the active edition of a database instead of --model, and follow it")
	f.set.DurationVar(&f.databaseWait, "database-wait", 0, "how `long` to wait at the start for a database that does not answer")
	f.set.DurationVar(&f.databasePoll, "database-poll", store.DefaultPoll, "how `often` to look for another active edition besides being told")
	f.set.IntVar(&f.editions, "editions", store.DefaultKeep, "how `many` of the editions that were activated last stay loaded")
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
	hup := make(chan os.Signal, 1)
	signal.Notify(hup, syscall.SIGHUP)
	defer signal.Stop(hup)
	models, source, follow, err := open(ctx, f, log, hup)
	if err != nil {
		return err
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	srv := &http.Server{
		Handler:           api.New(api.Config{Models: models, Source: source, Log: log, Registry: reg, Version: release, Commit: commit()}),
		ReadHeaderTimeout: headerTimeout,
		IdleTimeout:       idleTimeout,
		MaxHeaderBytes:    maxHeaderBytes,
		ErrorLog:          slog.NewLogLogger(log.Handler(), slog.LevelWarn),
	}
	l, err := net.Listen("tcp", f.listen)
	if err != nil {
		return err
	}
	log.Info("listening", "address", l.Addr().String(), "version", release, "commit", commit(), "model", models.Active().Ref(), "sha256", models.Active().SHA256())
	fctx, stop := context.WithCancel(ctx)
	var following sync.WaitGroup
	following.Go(func() { follow(fctx) })
	defer following.Wait()
	defer stop()
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
