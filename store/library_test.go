package store

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"strings"
	"sync"
	"testing"
	"time"

	"nearmargin/api"
	"nearmargin/api/wire"
	"nearmargin/setting"
	"nearmargin/store/storetest"
)

var (
	_ api.Models = (*Library)(nil)
	_ api.Source = (*Library)(nil)
)

var quiet = slog.New(slog.NewTextHandler(io.Discard, nil))

// library opens a library and follows until the test ends.
func library(t testing.TB, url string, cfg Config) *Library {
	t.Helper()
	cfg.URL, cfg.Log = url, quiet
	cfg.BackoffMin, cfg.BackoffMax = 20*time.Millisecond, 200*time.Millisecond
	ctx, cancel := context.WithCancel(context.Background())
	l, err := Open(ctx, cfg)
	if err != nil {
		cancel()
		t.Fatal(err)
	}
	done := make(chan struct{})
	go func() {
		l.Run(ctx)
		close(done)
	}()
	t.Cleanup(func() {
		cancel()
		<-done
	})
	return l
}

func activate(t testing.TB, url, ref string) {
	t.Helper()
	s, err := Connect(context.Background(), url)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close(context.Background())
	if err := s.Activate(context.Background(), ref); err != nil {
		t.Fatal(err)
	}
}

// answer asks a model at one place and returns the bytes.
func answer(t testing.TB, m *setting.Model) []byte {
	t.Helper()
	l, err := m.Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	var a setting.Answer
	if err := l.At(setting.SiteAt(-72.4, -36.1), &a); err != nil {
		t.Fatal(err)
	}
	return wire.AppendAnswer(nil, &a)
}

func refs(list []*setting.Model) string {
	var out []string
	for _, m := range list {
		out = append(out, m.Ref())
	}
	return strings.Join(out, " ")
}

// TestLibraryFollowsNotifications has a poll so rare that only a notification can
// have brought the change.
func TestLibraryFollowsNotifications(t *testing.T) {
	url := migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"), model(t, "3"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: time.Hour, Keep: 2})
	for _, step := range []struct{ activate, loaded string }{
		{"builtin@2", "builtin@2 builtin@1"},
		{"builtin@3", "builtin@3 builtin@2"},
		{"builtin@2", "builtin@2 builtin@3"},
	} {
		activate(t, url, step.activate)
		waitFor(t, step.activate+" to be active", func() bool { return l.Active().Ref() == step.activate })
		if got := refs(l.All()); got != step.loaded {
			t.Errorf("loaded are %s, want %s", got, step.loaded)
		}
		if m, ok := l.Find("builtin"); !ok || m != l.Active() {
			t.Errorf("the model's name alone finds %v", m)
		}
	}
	if m, ok := l.Find("builtin@3"); !ok || m.Ref() != "builtin@3" || !bytes.Contains(answer(t, m), []byte(`"edition":"3"`)) {
		t.Errorf("the edition before is %v", m)
	}
	if m, ok := l.Find("builtin@1"); ok {
		t.Errorf("an edition that is not kept is found: %s", m.Ref())
	}
}

// TestLibraryPollsToo activates past the trigger that notifies.
func TestLibraryPollsToo(t *testing.T) {
	url := migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: 50 * time.Millisecond})
	storetest.Exec(t, url, `ALTER TABLE nearmargin.activations DISABLE TRIGGER tell`)
	activate(t, url, "builtin@2")
	waitFor(t, "the poll", func() bool { return l.Active().Ref() == "builtin@2" })
	if since, _ := l.Degraded(); !since.IsZero() {
		t.Errorf("degraded since %v", since)
	}
}

func TestLibraryRefreshesWhenTold(t *testing.T) {
	url := migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: time.Hour})
	storetest.Exec(t, url, `ALTER TABLE nearmargin.activations DISABLE TRIGGER tell`)
	activate(t, url, "builtin@2")
	waitFor(t, "what it was told to look for", func() bool {
		l.Refresh()
		return l.Active().Ref() == "builtin@2"
	})
}

// TestLibraryKeepsAnsweringThroughAnOutage stops the server under load and starts it
// again.
func TestLibraryKeepsAnsweringThroughAnOutage(t *testing.T) {
	server, url := storetest.Get(t), migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: time.Second})
	waitFor(t, "it to be well", func() bool { since, _ := l.Degraded(); return since.IsZero() })
	want := answer(t, l.Active())

	stop := make(chan struct{})
	var asked, wrong int
	var load sync.WaitGroup
	load.Go(func() {
		for {
			select {
			case <-stop:
				return
			default:
			}
			asked++
			if m := l.Active(); m.Ref() == "builtin@1" && !bytes.Equal(answer(t, m), want) {
				wrong++
			}
		}
	})
	before := time.Now()
	server.Stop(t)
	waitFor(t, "the outage to be noticed", func() bool { since, _ := l.Degraded(); return !since.IsZero() })
	since, reason := l.Degraded()
	if since.Before(before) || reason != ErrUnavailable.Error() {
		t.Errorf("degraded since %v for %q; the server was stopped after %v", since, reason, before)
	}
	time.Sleep(time.Second) // several attempts to connect
	if again, _ := l.Degraded(); again != since {
		t.Errorf("degraded since %v, before that since %v; want the first moment kept", again, since)
	}
	if l.Active().Ref() != "builtin@1" {
		t.Errorf("serves %s", l.Active().Ref())
	}
	server.Start(t)
	waitFor(t, "recovery", func() bool { since, _ := l.Degraded(); return since.IsZero() })
	activate(t, url, "builtin@2")
	waitFor(t, "an activation after it", func() bool { return l.Active().Ref() == "builtin@2" })
	close(stop)
	load.Wait()
	if wrong > 0 || asked == 0 {
		t.Errorf("%d of %d answers differ from those before", wrong, asked)
	}
}

// TestLibraryKeepsTheOldWhereTheNewIsCorrupt damages an edition and makes it active
// behind the store's back.
func TestLibraryKeepsTheOldWhereTheNewIsCorrupt(t *testing.T) {
	url := migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: time.Hour})
	storetest.Exec(t, url, `UPDATE nearmargin.boundaries SET sigma_km = 99 FROM nearmargin.editions e WHERE e.edition_id = boundaries.edition_id AND edition = '2'`)
	storetest.Exec(t, url, `INSERT INTO nearmargin.activations (edition_id) SELECT edition_id FROM nearmargin.editions WHERE edition = '2'`)
	waitFor(t, "it to be noticed", func() bool { since, _ := l.Degraded(); return !since.IsZero() })
	if _, reason := l.Degraded(); reason != ErrCorrupt.Error() || l.Active().Ref() != "builtin@1" {
		t.Errorf("serves %s, degraded for %q", l.Active().Ref(), reason)
	}
	activate(t, url, "builtin@1")
	waitFor(t, "recovery", func() bool { since, _ := l.Degraded(); return since.IsZero() })
	if _, err := Open(context.Background(), Config{URL: url, Log: quiet, Keep: 2}); err != nil {
		t.Errorf("a corrupt edition that is kept besides the active one stops the start: %v", err)
	}
}

func TestOpenSaysWhyItCannot(t *testing.T) {
	server, ctx := storetest.Get(t), context.Background()
	unused := migrated(t)
	for name, c := range map[string]struct {
		url  string
		want error
	}{
		"down":           {"postgres://nobody@127.0.0.1:1/none", ErrUnavailable},
		"no schema":      {server.Empty(t), ErrNoSchema},
		"nothing active": {unused, ErrNothingActive},
	} {
		if _, err := Open(ctx, Config{URL: c.url, Log: quiet}); !errors.Is(err, c.want) {
			t.Errorf("%s: %v, want %v", name, err, c.want)
		}
	}
	for name, cfg := range map[string]Config{
		"no log": {URL: unused}, "negative": {URL: unused, Log: quiet, Keep: -1},
	} {
		if _, err := Open(ctx, cfg); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

// TestOpenWaitsForTheDatabase starts while the server is away.
func TestOpenWaitsForTheDatabase(t *testing.T) {
	server, url := storetest.Get(t), migrated(t)
	imported(t, url, model(t, "1"))
	activate(t, url, "builtin@1")
	server.Stop(t)
	type outcome struct {
		l   *Library
		err error
	}
	opened := make(chan outcome, 1)
	go func() {
		l, err := Open(context.Background(), Config{URL: url, Wait: 2 * time.Minute, BackoffMin: 20 * time.Millisecond, Log: quiet})
		opened <- outcome{l, err}
	}()
	select {
	case got := <-opened:
		t.Errorf("it did not wait: %v", got.err)
		server.Start(t)
		return
	case <-time.After(300 * time.Millisecond):
	}
	server.Start(t)
	if got := <-opened; got.err != nil || got.l.Active().Ref() != "builtin@1" {
		t.Errorf("%v", got.err)
	}
}

// TestKeepPicksTheLatestAndOneOfEachModel has more models than editions to keep.
func TestKeepPicksTheLatestAndOneOfEachModel(t *testing.T) {
	list := []Edition{{Model: "a", Edition: "3"}, {Model: "b", Edition: "9"}, {Model: "a", Edition: "2"}, {Model: "c", Edition: "1"}, {Model: "b", Edition: "8"}}
	for n, want := range map[int]string{
		1: "a@3 b@9 c@1", 2: "a@3 b@9 c@1", 3: "a@3 b@9 a@2 c@1", 9: "a@3 b@9 a@2 c@1 b@8",
	} {
		var got []string
		for _, e := range keep(list, n) {
			got = append(got, e.Ref())
		}
		if fmt.Sprint(got) != "["+want+"]" {
			t.Errorf("keep %d: %v, want %s", n, got, want)
		}
	}
}
