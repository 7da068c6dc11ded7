package store

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"strings"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

// What went wrong; every error of this package that comes from the database is an
// [Error] around one of these, or around the cause alone where none fits.
var (
	ErrUnavailable   = errors.New("the database does not answer")
	ErrNoSpace       = errors.New("the database's disk is full; nothing was changed, make space and try again")
	ErrNoSchema      = errors.New(`the database lacks the schema nearmargin, or has an older one; run "nearmargin migrate"`)
	ErrNoRights      = errors.New("the role lacks a right; reading needs USAGE on the schema nearmargin and SELECT on its tables")
	ErrNoEdition     = errors.New("there is no such edition")
	ErrNothingActive = errors.New(`no edition is active; run "nearmargin model activate ID@EDITION"`)
	ErrEditionExists = errors.New("the edition is there already; editions never change, so give the new one another name")
	ErrImportRunning = errors.New("another import is running; try again when it has ended")
	ErrImmutable     = errors.New("an edition that was once active never changes")
	ErrLimit         = errors.New("a row breaks a limit of the schema")
	ErrCorrupt       = errors.New("the rows do not make a model")
)

// Error is a fault of the store.
type Error struct {
	Op   string // what was being done: "import", "load", ...
	Ref  string // the model or edition, "" where it is about none
	Kind error  // one of the Err... values, nil where none fits
	Err  error  // the cause, nil where Kind says it all
}

func (e *Error) Error() string {
	parts := []string{strings.TrimSpace(e.Op + " " + e.Ref)}
	for _, err := range [...]error{e.Kind, e.Err} {
		if err != nil {
			parts = append(parts, err.Error())
		}
	}
	return strings.Join(parts, ": ")
}

// Unwrap returns the kind and the cause.
func (e *Error) Unwrap() []error {
	var out []error
	for _, err := range [...]error{e.Kind, e.Err} {
		if err != nil {
			out = append(out, err)
		}
	}
	return out
}

// ChecksumError says that an edition's rows make another model than was imported.
type ChecksumError struct {
	Ref          string
	Stored, Made string // SHA-256 in hex: when it was imported, of what the rows make now
}

func (e *ChecksumError) Error() string {
	return fmt.Sprintf("edition %s: its rows make a model with checksum %.12s…, it was imported with %.12s…; import it again under another edition", e.Ref, e.Made, e.Stored)
}

// Is makes a ChecksumError an ErrCorrupt.
func (e *ChecksumError) Is(target error) bool { return target == ErrCorrupt }

// immutable is the SQLSTATE that the schema's triggers raise.
const immutable = "NM001"

// interpretError is the one place that turns errors of the driver and SQLSTATEs
// into this package's kinds.
func interpretError(op, ref string, err error) error {
	if err == nil {
		return nil
	}
	if have := (*Error)(nil); errors.As(err, &have) {
		return err
	}
	e := &Error{Op: op, Ref: ref, Err: err}
	var pg *pgconn.PgError
	var dial *pgconn.ConnectError
	var network net.Error
	switch {
	case errors.As(err, &pg):
		e.Kind = kindOf(pg)
	case errors.Is(err, pgx.ErrNoRows):
		e.Kind, e.Err = ErrNoEdition, nil
	case errors.As(err, &dial):
		e.Kind = ErrUnavailable
	case errors.Is(err, context.Canceled):
	case errors.As(err, &network), errors.Is(err, net.ErrClosed), errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, io.EOF),
		pgconn.Timeout(err), strings.HasSuffix(err.Error(), "conn closed"): // the driver has no value for the last
		e.Kind = ErrUnavailable
	}
	return e
}

// kindOf reads a SQLSTATE; see appendix A of PostgreSQL's documentation.
func kindOf(e *pgconn.PgError) error {
	switch {
	case e.Code == immutable:
		return ErrImmutable
	case e.Code == "23505" && e.TableName == "editions":
		return ErrEditionExists
	case e.Code == "42501":
		return ErrNoRights
	case e.Code == "42P01", e.Code == "3F000", e.Code == "42703":
		return ErrNoSchema
	case strings.HasPrefix(e.Code, "23"), strings.HasPrefix(e.Code, "22"):
		return ErrLimit
	case e.Code == "53100":
		return ErrNoSpace
	case strings.HasPrefix(e.Code, "08"), strings.HasPrefix(e.Code, "57P"), strings.HasPrefix(e.Code, "53"):
		return ErrUnavailable
	}
	return nil
}
