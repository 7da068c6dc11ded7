package store

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"math/rand/v2"
	"sync/atomic"
	"time"

	"github.com/jackc/pgx/v5"

	"nearmargin/setting"
)

// The defaults of a [Config].
const (
	DefaultKeep       = 3
	DefaultPoll       = 30 * time.Second
	DefaultBackoffMin = 250 * time.Millisecond
	DefaultBackoffMax = 15 * time.Second
)

// askTimeout bounds one question about what is active, so that a connection which
// leads nowhere any more is noticed.
const askTimeout = 15 * time.Second

// Config says where a library loads from and how it follows.
type Config struct {
	URL string
	// Keep is how many of the editions that were activated last stay loaded, the active
	// one among them; each model's active edition stays besides. Default: DefaultKeep.
	Keep int
	// Poll is how long the library trusts that no notification was lost. Default: DefaultPoll.
	Poll time.Duration
	// Wait is how long to wait at the start for a database that does not answer;
	// 0 gives up at once.
	Wait time.Duration
	// BackoffMin and BackoffMax bound the time between attempts to connect. Defaults:
	// DefaultBackoffMin, DefaultBackoffMax.
	BackoffMin, BackoffMax time.Duration
	Log                    *slog.Logger // needed
	// Now tells the time for what is reported; waits run on timers, which do not see a
	// clock that is set. Default: time.Now.
	Now func() time.Time
}

func (c Config) withDefaults() (Config, error) {
	if c.Log == nil {
		return c, errors.New("store: Config.Log is missing")
	}
	if c.Keep < 0 || c.Poll < 0 || c.Wait < 0 {
		return c, fmt.Errorf("store: Keep %d, Poll %v and Wait %v must not be negative", c.Keep, c.Poll, c.Wait)
	}
	if c.Keep == 0 {
		c.Keep = DefaultKeep
	}
	if c.Poll == 0 {
		c.Poll = DefaultPoll
	}
	if c.BackoffMin <= 0 {
		c.BackoffMin = DefaultBackoffMin
	}
	if c.BackoffMax < c.BackoffMin {
		c.BackoffMax = max(DefaultBackoffMax, c.BackoffMin)
	}
	if c.Now == nil {
		c.Now = time.Now
	}
	return c, nil
}

// Library holds editions in memory and follows which are active. Its methods may be
// called at once from anywhere; none but Open and Run touches the database.
type Library struct {
	cfg       Config
	shelf     atomic.Pointer[shelf]
	condition atomic.Pointer[condition]
	again     chan struct{}
}

// condition is how the library's source fares; since is zero where all is well.
type condition struct {
	since  time.Time
	reason string
}

// shelf is what is loaded at one moment; it never changes.
type shelf struct {
	all []*setting.Model // the one activated last first
}

// Open loads the active edition and those to keep. The error is an ErrUnavailable
// where the database does not answer within the time to wait, an ErrNoSchema, an
// ErrNothingActive, an ErrNoRights, or an ErrCorrupt.
func Open(ctx context.Context, cfg Config) (*Library, error) {
	cfg, err := cfg.withDefaults()
	if err != nil {
		return nil, err
	}
	l := &Library{cfg: cfg, again: make(chan struct{}, 1)}
	l.condition.Store(&condition{})
	patience, cancel := context.WithTimeout(ctx, cfg.Wait)
	defer cancel()
	for pause := cfg.BackoffMin; ; pause = l.longer(pause) {
		err := l.first(ctx)
		if err == nil || !errors.Is(err, ErrUnavailable) || patience.Err() != nil {
			return l, err
		}
		cfg.Log.Warn("waiting for the database", "error", err, "again_in", pause.String())
		// where the patience ends first, one more attempt is the last
		if sleep(patience, pause) != nil && ctx.Err() != nil {
			return nil, ctx.Err()
		}
	}
}

func (l *Library) first(ctx context.Context) error {
	s, err := Connect(ctx, l.cfg.URL)
	if err != nil {
		return err
	}
	defer s.Close(context.WithoutCancel(ctx))
	return l.refresh(ctx, s)
}

// Active returns the edition that was activated last.
func (l *Library) Active() *setting.Model { return l.shelf.Load().all[0] }

// All returns every edition that is loaded, the active one first.
func (l *Library) All() []*setting.Model { return append([]*setting.Model(nil), l.shelf.Load().all...) }

// Find returns the edition "id@edition", or the active edition of the model "id",
// among those that are loaded.
func (l *Library) Find(ref string) (*setting.Model, bool) { return l.shelf.Load().find(ref) }

func (s *shelf) find(ref string) (*setting.Model, bool) {
	for _, m := range s.all { // of one model the one activated last comes first
		if ref == m.ID() || ref == m.Ref() {
			return m, true
		}
	}
	return nil, false
}

// Degraded says since when, and why, the library cannot follow the database; the
// time is zero where it can. What is loaded keeps answering.
func (l *Library) Degraded() (since time.Time, reason string) {
	c := l.condition.Load()
	if c.since.IsZero() {
		return c.since, c.reason
	}
	now := l.cfg.Now()
	return onClock(c.since, now, now.Sub(c.since)), c.reason
}

// stepped is by how much a clock must differ from the time that passed to count as
// set. What is less is the jitter of two readings.
const stepped = time.Second

// onClock returns what a clock that shows now would have shown at since, passed ago.
// That is since itself, unless the clock was set meanwhile; it is never after now.
func onClock(since, now time.Time, passed time.Duration) time.Time {
	if shown := now.Round(0).Sub(since.Round(0)); passed >= 0 && (shown-passed).Abs() < stepped {
		return since
	}
	return now.Round(0).Add(-max(0, passed))
}

// Refresh has Run look again at once for what is active.
func (l *Library) Refresh() {
	select {
	case l.again <- struct{}{}:
	default: // it is about to
	}
}

// Run follows activations until the context ends, and connects again whenever the
// connection is lost.
func (l *Library) Run(ctx context.Context) {
	pause := l.cfg.BackoffMin
	for ctx.Err() == nil {
		healthy := l.cfg.Now()
		err := l.follow(ctx)
		if ctx.Err() != nil {
			return
		}
		if l.cfg.Now().Sub(healthy) > l.cfg.BackoffMax {
			pause = l.cfg.BackoffMin
		}
		reason := ErrUnavailable.Error()
		if !errors.Is(err, ErrUnavailable) {
			reason = publicReason(err)
		}
		l.degrade(reason)
		l.cfg.Log.Error("lost the database; answering from memory", "error", err, "again_in", pause.String())
		if sleep(ctx, pause) != nil {
			return
		}
		pause = l.longer(pause)
	}
}

// follow listens on one connection until it fails. It listens before it looks, so
// that no activation falls between.
func (l *Library) follow(ctx context.Context) error {
	s, err := Connect(ctx, l.cfg.URL)
	if err != nil {
		return err
	}
	defer s.Close(context.WithoutCancel(ctx))
	if err := listen(ctx, s); err != nil {
		return err
	}
	for {
		if err := l.refresh(ctx, s); err != nil {
			if s.conn.IsClosed() || errors.Is(err, ErrUnavailable) {
				return err
			}
			l.degrade(publicReason(err))
			l.cfg.Log.Error("what is active cannot be loaded; answering from what was", "error", err)
		} else if since, _ := l.Degraded(); !since.IsZero() {
			l.condition.Store(&condition{})
			l.cfg.Log.Info("following the database again", "degraded_for", max(0, l.cfg.Now().Sub(since)).Round(time.Millisecond).String())
		}
		if err := l.await(ctx, s); err != nil {
			return err
		}
	}
}

func listen(ctx context.Context, s *Store) error {
	ctx, cancel := context.WithTimeout(ctx, askTimeout)
	defer cancel()
	_, err := s.conn.Exec(ctx, `LISTEN nearmargin_activation`)
	return interpretError("listen", "", err)
}

// await returns when there may be something new.
func (l *Library) await(ctx context.Context, s *Store) error {
	wctx, cancel := context.WithTimeout(ctx, l.cfg.Poll)
	defer cancel()
	stop := make(chan struct{})
	defer close(stop)
	go func() {
		select {
		case <-l.again:
			cancel()
		case <-stop:
		}
	}()
	_, err := s.conn.WaitForNotification(wctx)
	if err != nil && wctx.Err() != nil && ctx.Err() == nil && !s.conn.IsClosed() {
		return nil
	}
	return interpretError("listen", "", err)
}

// The editions by the time of their last activation, newest first. The log is short,
// and read whole.
const shelfSQL = `
SELECT e.model_id, e.edition, e.sha256 FROM nearmargin.editions e
JOIN (SELECT edition_id, max(activation_id) AS last FROM nearmargin.activations GROUP BY edition_id) a USING (edition_id)
ORDER BY a.last DESC`

// refresh makes the shelf what the database says, in one step. Where the active
// edition cannot be loaded, the shelf stays as it is.
func (l *Library) refresh(ctx context.Context, s *Store) error {
	actx, cancel := context.WithTimeout(ctx, askTimeout)
	defer cancel()
	rows, err := s.conn.Query(actx, shelfSQL)
	if err != nil {
		return interpretError("look for the active edition", "", err)
	}
	wanted, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (e Edition, err error) {
		err = row.Scan(&e.Model, &e.Edition, &e.SHA256)
		return e, err
	})
	if err != nil {
		return interpretError("look for the active edition", "", err)
	}
	if wanted = keep(wanted, l.cfg.Keep); len(wanted) == 0 {
		return &Error{Op: "look for the active edition", Kind: ErrNothingActive}
	}
	old := l.shelf.Load()
	next := &shelf{}
	for i, e := range wanted {
		m, err := l.get(ctx, s, old, &e)
		switch {
		case err == nil:
			next.all = append(next.all, m)
		case i == 0 || s.conn.IsClosed() || errors.Is(err, ErrUnavailable):
			return err
		default:
			l.cfg.Log.Warn("an edition that was active once is left out", "model", e.Ref(), "error", err)
		}
	}
	if old == nil || old.all[0] != next.all[0] {
		l.cfg.Log.Info("active edition", "model", next.all[0].Ref(), "sha256", next.all[0].SHA256(), "loaded", len(next.all))
	}
	l.shelf.Store(next)
	return nil
}

// get returns an edition, from the old shelf where it stands there.
func (l *Library) get(ctx context.Context, s *Store, old *shelf, e *Edition) (*setting.Model, error) {
	if old != nil {
		if m, ok := old.find(e.Ref()); ok && m.SHA256() == e.SHA256 {
			return m, nil
		}
	}
	b, err := s.Load(ctx, e.Ref())
	if err != nil {
		return nil, err
	}
	return b.Model, nil
}

// keep picks the first n editions and the first of every model.
func keep(list []Edition, n int) []Edition {
	var out []Edition
	seen := map[string]bool{}
	for i, e := range list {
		if i < n || !seen[e.Model] {
			out = append(out, e)
		}
		seen[e.Model] = true
	}
	return out
}

// degrade notes that something fails, from the first time on.
func (l *Library) degrade(reason string) {
	since := l.cfg.Now()
	if c := l.condition.Load(); !c.since.IsZero() {
		since = c.since
	}
	l.condition.Store(&condition{since, reason})
}

// publicReason is what may be told to anybody: no host, no role, no cause.
func publicReason(err error) string {
	for _, kind := range [...]error{ErrCorrupt, ErrNoSchema, ErrNoRights, ErrNothingActive, ErrNoSpace, ErrUnavailable} {
		if errors.Is(err, kind) {
			return kind.Error()
		}
	}
	return "the active edition cannot be read; the log says why"
}

func (l *Library) longer(pause time.Duration) time.Duration {
	next := min(2*pause, l.cfg.BackoffMax)
	return next - time.Duration(rand.Int64N(int64(next)/4+1)) // #nosec G404 -- spreads attempts in time, and guards nothing; so that many services do not come back at once
}

func sleep(ctx context.Context, d time.Duration) error {
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-ctx.Done():
		return ctx.Err()
	case <-t.C:
		return nil
	}
}
