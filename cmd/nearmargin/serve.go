package main

import (
	"context"
	"fmt"
	"log/slog"
	"os"
	"os/signal"
	"sync"
	"syscall"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"
	"go.opentelemetry.io/otel/trace"

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
	f.operationFlags()
	f.more = "SIGHUP reads a model directory and the file of tokens again. Traces are sent where\n" +
		otelEndpoint + " names a collector, and set up by OpenTelemetry's other variables."
}

// serve answers over HTTP until the context ends.
func serve(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	access, err := f.serving.validate()
	if err != nil {
		return err
	}
	traced, err := wantsTraces(p.env)
	if err != nil {
		return usageError("%v", err)
	}
	lines := newLogWriter(p.stderr)
	defer lines.close()
	log := slog.New(slog.NewJSONHandler(lines, nil)) // which writes a line a call
	signal.Ignore(syscall.SIGPIPE)                   // the reader of the log may go; the service stays
	hup := make(chan os.Signal, 1)
	signal.Notify(hup, syscall.SIGHUP)
	defer signal.Stop(hup)
	from, err := open(ctx, f, log)
	if err != nil {
		return err
	}
	if f.serving.checkOnly {
		f.printConfig(p.stdout)
		if traced {
			fmt.Fprintln(p.stdout, "# traces are sent where "+otelEndpoint+" or "+otelTracesEndpoint+" says")
		}
		return nil
	}
	var tracer trace.Tracer
	if traced {
		made, sendLast, err := startTraces(ctx, log)
		if err != nil {
			return err
		}
		defer sendLast()
		tracer = made
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	h := api.New(api.Config{
		Models: from.models, Source: from.source, Log: log, Registry: reg, Version: release, Commit: commit(),
		Limits: f.serving.limits, Access: access, BasePath: f.serving.basePath, PrivateMetrics: f.serving.privateListen != "", Tracer: tracer,
	})
	fctx, stop := context.WithCancel(ctx)
	var following sync.WaitGroup
	defer following.Wait()
	defer stop()
	return f.serving.listenAndServe(ctx, log, f.listen, h, func(address string) {
		m := from.models.Active()
		log.Info("listening", "address", address, "version", release, "commit", commit(), "model", m.Ref(), "sha256", m.SHA256())
		following.Go(func() { from.follow(fctx) })
		following.Go(func() {
			for {
				select {
				case <-fctx.Done():
					return
				case <-hup:
					f.serving.reloadTokens(access.Tokens, log)
					from.reload()
				}
			}
		})
	})
}
