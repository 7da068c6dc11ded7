package main

import (
	"context"
	"log/slog"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"

	"nearmargin/api"
)

func serveFlags(f *flags) {
	f.modelFlag()
	f.set.StringVar(&f.listen, "listen", "127.0.0.1:8080", "`address` to listen on")
	f.operationFlags()
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
	log := slog.New(slog.NewJSONHandler(p.stderr, nil))
	b, err := load(f.model)
	if err != nil {
		return err
	}
	if f.serving.checkOnly {
		f.printConfig(p.stdout)
		return nil
	}
	for _, x := range b.Model.Network().Faults() {
		log.Warn("fault of the boundary network", "lon", x.At.Lon, "lat", x.At.Lat, "code", x.Code, "detail", x.Detail)
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	h := api.New(api.Config{
		Models: one{b.Model}, Log: log, Registry: reg, Version: release, Commit: commit(),
		Limits: f.serving.limits, Access: access, BasePath: f.serving.basePath, PrivateMetrics: f.serving.privateListen != "",
	})
	return f.serving.listenAndServe(ctx, log, f.listen, h, func(address string) {
		log.Info("listening", "address", address, "version", release, "commit", commit(), "model", b.Model.Ref(), "sha256", b.Model.SHA256())
	})
}
