package store

import (
	"context"
	"fmt"
	"net"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"
)

// connectTimeout bounds one attempt to connect, where the URL gives no bound.
const connectTimeout = 10 * time.Second

// keepAlive is how a peer that is gone without a word is noticed while an answer is
// waited for: after half a minute, where the driver's own settings take most of an hour.
var keepAlive = net.KeepAliveConfig{Enable: true, Idle: 15 * time.Second, Interval: 5 * time.Second, Count: 3}

// Store is a connection to the database.
type Store struct {
	conn    *pgx.Conn
	silence time.Duration // that a load bears; see [Store.Load]
}

// Connect connects to a PostgreSQL URL or key-value string.
func Connect(ctx context.Context, url string) (*Store, error) {
	conn, err := connect(ctx, url)
	if err != nil {
		return nil, err
	}
	return &Store{conn, askTimeout}, nil
}

func connect(ctx context.Context, url string) (*pgx.Conn, error) {
	cfg, err := pgx.ParseConfig(url)
	if err != nil {
		return nil, &Error{Op: "connect", Err: err} // the driver masks the password
	}
	if cfg.ConnectTimeout == 0 {
		cfg.ConnectTimeout = connectTimeout
	}
	if cfg.RuntimeParams["application_name"] == "" {
		cfg.RuntimeParams["application_name"] = "nearmargin"
	}
	cfg.DialFunc = (&net.Dialer{KeepAliveConfig: keepAlive}).DialContext
	conn, err := pgx.ConnectConfig(ctx, cfg)
	return conn, interpretError("connect", "", err)
}

// Close ends the connection.
func (s *Store) Close(ctx context.Context) error { return s.conn.Close(ctx) }

// Edition is what the store knows of an edition without loading it.
type Edition struct {
	Model, Edition string
	Title, Licence string
	Citations      []string
	SHA256         string
	Warnings       []string // faults of its boundary network
	ImportedAt     time.Time
	ImportedBy     string
	ActivatedAt    time.Time // the last time; zero where it never was
	ActivatedBy    string
	Active         bool // the service answers from it where a request names no model
	ActiveOfModel  bool // a request that names the model alone gets it
}

// Ref returns "id@edition".
func (e *Edition) Ref() string { return e.Model + "@" + e.Edition }

// All editions; a few dozen rows, which no index would make faster.
const listSQL = `
SELECT e.model_id, e.edition, e.title, e.licence, coalesce(e.citations, '{}'), e.sha256, e.warnings, e.imported_at, e.imported_by,
       a.activated_at, coalesce(a.activated_by, ''),
       a.activation_id IS NOT NULL AND a.activation_id = max(a.activation_id) OVER (),
       a.activation_id IS NOT NULL AND a.activation_id = max(a.activation_id) OVER (PARTITION BY e.model_id)
FROM nearmargin.editions e
LEFT JOIN LATERAL (
    SELECT * FROM nearmargin.activations WHERE edition_id = e.edition_id ORDER BY activation_id DESC LIMIT 1
) a ON true
ORDER BY e.model_id, e.imported_at, e.edition`

// List returns all editions, by model and then by the time of import.
func (s *Store) List(ctx context.Context) ([]Edition, error) {
	rows, err := s.conn.Query(ctx, listSQL)
	if err != nil {
		return nil, interpretError("list", "", err)
	}
	out, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (e Edition, err error) {
		var activated *time.Time
		err = row.Scan(&e.Model, &e.Edition, &e.Title, &e.Licence, &e.Citations, &e.SHA256, &e.Warnings, &e.ImportedAt, &e.ImportedBy,
			&activated, &e.ActivatedBy, &e.Active, &e.ActiveOfModel)
		if activated != nil {
			e.ActivatedAt = *activated
		}
		return e, err
	})
	return out, interpretError("list", "", err)
}

// splitRef takes "id@edition" or "id" apart.
func splitRef(ref string) (id, edition string, err error) {
	id, edition, ok := strings.Cut(ref, "@")
	if id == "" || ok && edition == "" {
		return "", "", fmt.Errorf("%q names no edition; want ID@EDITION", ref)
	}
	return id, edition, nil
}

// One edition by its unique name.
const editionIDSQL = `SELECT edition_id FROM nearmargin.editions WHERE model_id = @model AND edition = @edition`

// The activation goes in whole or not at all, and the trigger tells those who listen
// when it is committed. The lock puts activations into one order.
const activateSQL = `INSERT INTO nearmargin.activations (edition_id) VALUES (@edition_id)`

// Activate makes an edition the active one, also an earlier one again. The edition is
// loaded first: one that cannot be loaded is never made active.
func (s *Store) Activate(ctx context.Context, ref string) error {
	id, edition, err := splitRef(ref)
	if err == nil && edition == "" {
		err = fmt.Errorf("%q names a model; want ID@EDITION", ref)
	}
	if err != nil {
		return &Error{Op: "activate", Err: err}
	}
	if _, err := s.Load(ctx, ref); err != nil {
		return err
	}
	err = pgx.BeginFunc(ctx, s.conn, func(tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, `LOCK TABLE nearmargin.activations IN SHARE ROW EXCLUSIVE MODE`); err != nil {
			return err
		}
		var editionID int64
		if err := tx.QueryRow(ctx, editionIDSQL, pgx.StrictNamedArgs{"model": id, "edition": edition}).Scan(&editionID); err != nil {
			return err
		}
		_, err := tx.Exec(ctx, activateSQL, pgx.StrictNamedArgs{"edition_id": editionID})
		return err
	})
	return interpretError("activate", ref, err)
}
