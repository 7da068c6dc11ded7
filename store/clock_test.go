package store

import (
	"bytes"
	"context"
	"errors"
	"log/slog"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"pgregory.net/rapid"

	"nearmargin/store/storetest"
)

// nobody is the address of a database that is not there.
const nobody = "postgres://nobody@127.0.0.1:1/none"

// jumping is a clock that is set at every reading, hours forward and back. It has no
// monotonic reading that would make up for that.
func jumping() func() time.Time {
	var n atomic.Int64
	jumps := []time.Duration{0, 5 * time.Hour, -7 * time.Hour, 48 * time.Hour, -time.Millisecond, -30 * 24 * time.Hour}
	return func() time.Time {
		return time.Now().Round(0).Add(jumps[int(n.Add(1))%len(jumps)])
	}
}

// TestOnClock: what is told of a moment agrees with the clock that now shows.
func TestOnClock(t *testing.T) {
	noon := time.Date(2026, 12, 1, 12, 0, 0, 0, time.UTC)
	for _, c := range []struct {
		name            string
		since, now      time.Time
		passed          time.Duration
		want            time.Time
		wantedUnchanged bool
	}{
		{"an hour by both", noon, noon.Add(time.Hour), time.Hour, noon, true},
		{"readings that differ by less than a second", noon, noon.Add(time.Hour + 3*time.Millisecond), time.Hour, noon, true},
		{"set forward by 50 years, as after a start without a clock", noon.AddDate(-50, 0, 0), noon, time.Minute, noon.Add(-time.Minute), false},
		{"set back by two hours after one", noon, noon.Add(-time.Hour), time.Hour, noon.Add(-2 * time.Hour), false},
		{"back, and the clock has no monotonic reading", noon, noon.Add(-time.Hour), -time.Hour, noon.Add(-time.Hour), false},
		{"at once", noon, noon, 0, noon, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := onClock(c.since, c.now, c.passed)
			if !got.Equal(c.want) || got.After(c.now) && !c.wantedUnchanged || c.wantedUnchanged != (got == c.since) {
				t.Errorf("%v, want %v", got, c.want)
			}
		})
	}
}

// TestDegradedWhenTheClockIsSet: since when is never in the future, so that no age
// is below 0, and the reason stays.
func TestDegradedWhenTheClockIsSet(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		now := time.Unix(1_700_000_000, 0)
		l := &Library{cfg: Config{Now: func() time.Time { return now }}}
		l.condition.Store(&condition{})
		if since, _ := l.Degraded(); !since.IsZero() {
			t.Fatalf("degraded since %v", since)
		}
		l.degrade("gone")
		for range rapid.IntRange(1, 20).Draw(t, "readings") {
			now = now.Add(time.Duration(rapid.Int64Range(-72*3600, 72*3600).Draw(t, "clock moves by, s")) * time.Second)
			if rapid.Bool().Draw(t, "fails again") {
				l.degrade("still gone")
			}
			since, reason := l.Degraded()
			if since.IsZero() || since.After(now) || !strings.HasSuffix(reason, "gone") {
				t.Fatalf("at %v degraded since %v for %q", now, since, reason)
			}
		}
	})
}

// TestOpenGivesUpWhateverTheClockShows: the patience with a database that does not
// answer is measured by a timer, so that no jump makes it hours.
func TestOpenGivesUpWhateverTheClockShows(t *testing.T) {
	done := make(chan error, 1)
	go func() {
		_, err := Open(context.Background(), Config{URL: nobody, Log: quiet, Wait: 300 * time.Millisecond, BackoffMin: 20 * time.Millisecond, Now: jumping()})
		done <- err
	}()
	select {
	case err := <-done:
		if !errors.Is(err, ErrUnavailable) {
			t.Errorf("%v, want %v", err, ErrUnavailable)
		}
	case <-time.After(time.Minute):
		t.Fatal("it waits on")
	}
}

// syncBuffer is a buffer that goroutines may share.
type syncBuffer struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (s *syncBuffer) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.Write(p)
}

func (s *syncBuffer) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.String()
}

// TestRunConnectsAgainWhateverTheClockShows: attempts go on at their pace while the
// clock is set hours forward and back, and Run ends when told.
func TestRunConnectsAgainWhateverTheClockShows(t *testing.T) {
	var log syncBuffer
	cfg, err := Config{URL: nobody, Log: slog.New(slog.NewTextHandler(&log, nil)), BackoffMin: time.Millisecond, BackoffMax: 20 * time.Millisecond, Now: jumping()}.withDefaults()
	if err != nil {
		t.Fatal(err)
	}
	l := &Library{cfg: cfg, again: make(chan struct{}, 1)}
	l.condition.Store(&condition{})
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	ended := make(chan struct{})
	go func() {
		l.Run(ctx)
		close(ended)
	}()
	waitFor(t, "ten attempts", func() bool { return strings.Count(log.String(), "lost the database") >= 10 })
	cancel()
	select {
	case <-ended:
	case <-time.After(time.Minute):
		t.Fatal("Run does not end")
	}
}

// TestLibraryFollowsWhateverTheClockShows follows by polls alone, through an outage,
// on a clock that is set at every reading.
func TestLibraryFollowsWhateverTheClockShows(t *testing.T) {
	server, url := storetest.Get(t), migrated(t)
	imported(t, url, model(t, "1"), model(t, "2"))
	activate(t, url, "builtin@1")
	l := library(t, url, Config{Poll: 50 * time.Millisecond, Now: jumping()})
	server.Stop(t)
	waitFor(t, "the outage to be noticed", func() bool { since, _ := l.Degraded(); return !since.IsZero() })
	server.Start(t)
	waitFor(t, "recovery", func() bool { since, _ := l.Degraded(); return since.IsZero() })
	storetest.Exec(t, url, `ALTER TABLE nearmargin.activations DISABLE TRIGGER tell`)
	activate(t, url, "builtin@2")
	waitFor(t, "the poll", func() bool { return l.Active().Ref() == "builtin@2" })
}
