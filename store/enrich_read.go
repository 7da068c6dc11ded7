package store

import (
	"bufio"
	"bytes"
	"context"
	"encoding/binary"
	"fmt"
	"io"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

// sessionSQL makes values read the same on every server.
const sessionSQL = `SET client_encoding TO 'UTF8'; SET standard_conforming_strings TO on; SET datestyle TO 'ISO, YMD';
SET intervalstyle TO 'postgres'; SET extra_float_digits TO 1; SET statement_timeout TO 0; SET idle_in_transaction_session_timeout TO 0`

func openSession(ctx context.Context, url string) (*pgx.Conn, error) {
	conn, err := connect(ctx, url)
	if err != nil {
		return nil, err
	}
	if _, err := conn.Exec(ctx, sessionSQL); err != nil {
		_ = conn.Close(context.WithoutCancel(ctx)) // the first error is the one to tell
		return nil, enrichError("", err)
	}
	return conn, nil
}

// makeWGS84SQL makes the session's own function that turns a geometry into WGS84; what
// it cannot turn is the fault of one row and not the end of all.
const makeWGS84SQL = `
CREATE FUNCTION pg_temp.nearmargin_wgs84(g geometry, most int, OUT wkb bytea, OUT fault text) LANGUAGE plpgsql STABLE AS $$
BEGIN
    IF g IS NULL THEN
        fault := 'the geometry is missing';
    ELSIF ST_IsEmpty(g) THEN
        fault := 'the geometry is empty';
    ELSIF most > 0 AND ST_NPoints(g) > most THEN
        fault := format('the geometry has more than %s positions, which is the limit; generalise it', most);
    ELSIF ST_SRID(g) = 0 THEN
        fault := 'the geometry has no SRID; say with ST_SetSRID in what system its coordinates are';
    ELSE
        wkb := ST_AsBinary(ST_Force2D(ST_Transform(g, 4326)), 'NDR');
    END IF;
EXCEPTION WHEN OTHERS THEN
    wkb := NULL;
    fault := 'the geometry cannot be turned into WGS84: ' || SQLERRM;
END $$`

// copyRows are the rows that a COPY in binary form sends; see "COPY" in PostgreSQL's
// documentation. They come as they are read: the server waits.
type copyRows struct {
	in     *bufio.Reader
	pipe   *io.PipeReader
	cancel context.CancelFunc
	done   chan struct{}
	row    EnrichRow
	fields [][]byte
	head   bool
}

var copySignature = []byte("PGCOPY\n\xff\r\n\x00")

// startCopy runs a COPY of key, geometry, fault and further columns.
func startCopy(ctx context.Context, conn *pgconn.PgConn, sql string, extra int) *copyRows {
	ctx, cancel := context.WithCancel(ctx)
	pr, pw := io.Pipe()
	c := &copyRows{in: bufio.NewReaderSize(pr, 1<<16), pipe: pr, cancel: cancel, done: make(chan struct{})}
	c.fields = make([][]byte, 3+extra)
	c.row.Extra = make([]string, extra)
	go func() {
		defer close(c.done)
		_, err := conn.CopyTo(ctx, pw, sql)
		pw.CloseWithError(err) // nil reads as the end
	}()
	return c
}

// stop ends the COPY, also half way.
func (c *copyRows) stop() {
	c.cancel()
	_ = c.pipe.Close() // never fails
	<-c.done
}

// next returns the next row, nil after the last. It is valid until the next call.
func (c *copyRows) next() (*EnrichRow, error) {
	if !c.head {
		var head [19]byte // signature, flags, length of an extension
		if _, err := io.ReadFull(c.in, head[:]); err != nil {
			return nil, err
		}
		if !bytes.Equal(head[:11], copySignature) {
			return nil, fmt.Errorf("the server's COPY starts with %q", head[:11])
		}
		if _, err := c.in.Discard(int(binary.BigEndian.Uint32(head[15:]))); err != nil {
			return nil, err
		}
		c.head = true
	}
	var n [4]byte
	if _, err := io.ReadFull(c.in, n[:2]); err != nil {
		return nil, err
	}
	count := int16(binary.BigEndian.Uint16(n[:2])) // #nosec G115 -- the format has a signed number here
	if count == -1 {
		_, err := c.in.ReadByte() // the end, or what went wrong after the last row
		if err == io.EOF {
			err = nil
		}
		return nil, err
	}
	if int(count) != len(c.fields) {
		return nil, fmt.Errorf("the server's COPY sent %d columns, want %d", count, len(c.fields))
	}
	for i := range c.fields {
		if _, err := io.ReadFull(c.in, n[:]); err != nil {
			return nil, err
		}
		size := int32(binary.BigEndian.Uint32(n[:])) // #nosec G115 -- the format has a signed number here
		if size < 0 {
			c.fields[i] = nil
			continue
		}
		if cap(c.fields[i]) < int(size) || c.fields[i] == nil {
			c.fields[i] = make([]byte, size)
		}
		c.fields[i] = c.fields[i][:size]
		if _, err := io.ReadFull(c.in, c.fields[i]); err != nil {
			return nil, err
		}
	}
	c.row.Key, c.row.WKB, c.row.Fault = string(c.fields[0]), c.fields[1], string(c.fields[2])
	for i := range c.row.Extra {
		c.row.Extra[i] = string(c.fields[3+i])
	}
	return &c.row, nil
}
