package main

import (
	"context"
	"log/slog"

	"nearmargin/api"
	"nearmargin/setting/bundle"
	"nearmargin/store"
)

// place is where models come from while the service runs.
type place struct {
	models api.Models
	source api.Source                // nil where the place cannot fail
	follow func(ctx context.Context) // follows changes until the context ends
	reload func()                    // looks again at once
}

// open loads what is to be served, from a database or from a directory. A
// database's active edition is followed; a directory is read again when told.
func open(ctx context.Context, f *flags, log *slog.Logger) (*place, error) {
	if f.database != "" {
		l, err := store.Open(ctx, store.Config{URL: f.database, Keep: f.editions, Poll: f.databasePoll, Wait: f.databaseWait, Log: log})
		if err != nil {
			return nil, err
		}
		return &place{models: l, source: l, follow: l.Run, reload: l.Refresh}, nil
	}
	b, err := load(f.model)
	if err != nil {
		return nil, err
	}
	warn(log, b)
	s := &single{}
	s.m.Store(b.Model)
	return &place{models: s, follow: func(context.Context) {}, reload: func() { s.reload(f.model, log) }}, nil
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
