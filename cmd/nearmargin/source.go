package main

import (
	"context"
	"log/slog"
	"os"

	"nearmargin/api"
	"nearmargin/setting/bundle"
	"nearmargin/store"
)

// open loads what is to be served. The function that it returns follows changes
// until its context ends: of a database's active edition, or, at the signal, of a
// directory.
func open(ctx context.Context, f *flags, log *slog.Logger, hup <-chan os.Signal) (api.Models, api.Source, func(context.Context), error) {
	if f.database != "" {
		return openDatabase(ctx, f, log, hup)
	}
	b, err := load(f.model)
	if err != nil {
		return nil, nil, nil, err
	}
	warn(log, b)
	s := &single{}
	s.m.Store(b.Model)
	return s, nil, func(ctx context.Context) {
		for {
			select {
			case <-ctx.Done():
				return
			case <-hup:
				s.reload(f.model, log)
			}
		}
	}, nil
}

// warn logs the faults of a model's boundary network.
func warn(log *slog.Logger, b *bundle.Bundle) {
	for _, x := range b.Model.Network().Faults() {
		log.Warn("fault of the boundary network", "lon", x.At.Lon, "lat", x.At.Lat, "code", x.Code, "detail", x.Detail)
	}
}

// reload reads the model again. One that fails its check leaves the old one in place.
func (s *single) reload(name string, log *slog.Logger) {
	b, err := load(name)
	if err != nil {
		log.Error("the model was not reloaded; the old one stays", "error", err, "model", s.Active().Ref())
		return
	}
	warn(log, b)
	s.m.Store(b.Model)
	log.Info("the model was reloaded", "model", b.Model.Ref(), "sha256", b.Model.SHA256())
}

func openDatabase(ctx context.Context, f *flags, log *slog.Logger, hup <-chan os.Signal) (api.Models, api.Source, func(context.Context), error) {
	l, err := store.Open(ctx, store.Config{URL: f.database, Keep: f.editions, Poll: f.databasePoll, Wait: f.databaseWait, Log: log})
	if err != nil {
		return nil, nil, nil, err
	}
	return l, l, func(ctx context.Context) {
		go func() {
			for {
				select {
				case <-ctx.Done():
					return
				case <-hup:
					l.Refresh()
				}
			}
		}()
		l.Run(ctx)
	}, nil
}
