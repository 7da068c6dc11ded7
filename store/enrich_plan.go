package store

import (
	"context"
	"fmt"
	"maps"
	"slices"
	"strings"

	"github.com/jackc/pgx/v5"
)

// column is what the catalogue says of one.
type column struct {
	typ    string // as SQL spells it
	base   string // the name of the type alone
	unique bool   // by itself, by an index over all rows
}

// The columns of a table or view by name, from the catalogue's index on the table.
const columnsSQL = `
SELECT a.attname, format_type(a.atttypid, a.atttypmod), t.typname,
       EXISTS (SELECT FROM pg_index i WHERE i.indrelid = a.attrelid AND i.indisunique AND i.indisvalid AND i.indpred IS NULL
               AND i.indnkeyatts = 1 AND i.indkey[0] = a.attnum)
FROM pg_attribute a JOIN pg_type t ON t.oid = a.atttypid
WHERE a.attrelid = to_regclass(@table) AND a.attnum > 0 AND NOT a.attisdropped`

func columnsOf(ctx context.Context, tx pgx.Tx, table string) (map[string]column, error) {
	rows, err := tx.Query(ctx, columnsSQL, pgx.StrictNamedArgs{"table": table})
	if err != nil {
		return nil, err
	}
	out := map[string]column{}
	var name string
	var c column
	_, err = pgx.ForEachRow(rows, []any{&name, &c.typ, &c.base, &c.unique}, func() error {
		out[name] = c
		return nil
	})
	return out, err
}

// sourceTable is what is known of what is to be read.
type sourceTable struct {
	columns           map[string]column
	keyType           string
	rows, keys, twice int64 // rows that are read; of them, with a key; of those, whose key another has
}

// inspectSource looks at the table's columns and counts the rows.
func inspectSource(ctx context.Context, tx pgx.Tx, spec *EnrichSpec, n *enrichNames) (*sourceTable, error) {
	columns, err := columnsOf(ctx, tx, n.source)
	if err != nil {
		return nil, err
	}
	if len(columns) == 0 {
		return nil, enrichFault(spec.Source, "there is no such table, or the role may not see it; want TABLE or SCHEMA.TABLE, spelt as it is in the catalogue")
	}
	for _, x := range append([]string{spec.Key, spec.Geometry}, spec.Extra...) {
		if _, ok := columns[x]; !ok {
			return nil, enrichFault(spec.Source, "there is no column %q; the columns are %s", x, strings.Join(slices.Sorted(maps.Keys(columns)), ", "))
		}
	}
	if g := columns[spec.Geometry]; g.base != "geometry" && g.base != "geography" {
		return nil, enrichFault(spec.Source, "the column %q is of type %s; it must be geometry or geography", spec.Geometry, g.typ)
	}
	s := &sourceTable{columns: columns, keyType: columns[spec.Key].typ}
	distinct := "count(DISTINCT " + n.key + ")"
	if columns[spec.Key].unique {
		distinct = "count(" + n.key + ")" // without a sort
	}
	sql := fmt.Sprintf(`SELECT count(*), count(%s), count(%[1]s) - %s FROM %s WHERE true%s`, n.key, distinct, n.source, andWhere(spec.Where))
	return s, tx.QueryRow(ctx, sql).Scan(&s.rows, &s.keys, &s.twice)
}

// check refuses a key that does not tell rows apart.
func (s *sourceTable) check(spec *EnrichSpec) error {
	switch {
	case s.keys < s.rows:
		return enrichFault(spec.Source, "%d of %d rows have no value of the key %q; leave them out with a condition, or name another key", s.rows-s.keys, s.rows, spec.Key)
	case s.twice > 0:
		return enrichFault(spec.Source, "%d rows have a value of the key %q that another row has; name a column that tells rows apart", s.twice, spec.Key)
	}
	return nil
}

// EnrichPlan is what a run would do.
type EnrichPlan struct {
	Rows         int64
	Key          EnrichColumn
	Geometry     EnrichColumn
	Extra        []EnrichColumn
	Kinds        []EnrichKind // from the most frequent
	TargetExists bool
	TargetRows   int64
	KeyFault     string // why the key will not do, "" where it does
}

// EnrichKind counts the rows of one type of geometry and reference system.
type EnrichKind struct {
	Type string // "missing" for NULL
	SRID int    // 0 where there is none
	Rows int64
}

// PlanEnrich looks at what Enrich would do, in one snapshot, and writes nothing.
func PlanEnrich(ctx context.Context, url string, spec EnrichSpec) (*EnrichPlan, error) {
	n, err := namesOf(&spec)
	if err != nil {
		return nil, err
	}
	conn, err := openSession(ctx, url)
	if err != nil {
		return nil, err
	}
	defer conn.Close(context.WithoutCancel(ctx))
	p := &EnrichPlan{}
	err = pgx.BeginTxFunc(ctx, conn, pgx.TxOptions{IsoLevel: pgx.RepeatableRead, AccessMode: pgx.ReadOnly}, func(tx pgx.Tx) error {
		s, err := inspectSource(ctx, tx, &spec, n)
		if err != nil {
			return err
		}
		of := func(name string) EnrichColumn { return EnrichColumn{name, s.columns[name].typ} }
		p.Rows, p.Key, p.Geometry = s.rows, of(spec.Key), of(spec.Geometry)
		for _, x := range spec.Extra {
			p.Extra = append(p.Extra, of(x))
		}
		if err := s.check(&spec); err != nil {
			p.KeyFault = err.(*Error).Err.Error()
		}
		sql := fmt.Sprintf(`
SELECT CASE WHEN g IS NULL THEN 'missing' WHEN ST_IsEmpty(g) THEN 'empty ' || GeometryType(g) ELSE GeometryType(g) END, coalesce(ST_SRID(g), 0), count(*)
FROM (SELECT %s::geometry AS g FROM %s WHERE true%s) t GROUP BY 1, 2 ORDER BY 3 DESC, 1, 2`, n.geometry, n.source, andWhere(spec.Where))
		rows, err := tx.Query(ctx, sql)
		if err != nil {
			return err
		}
		if p.Kinds, err = pgx.CollectRows(rows, pgx.RowToStructByPos[EnrichKind]); err != nil {
			return err
		}
		if err := tx.QueryRow(ctx, `SELECT to_regclass(@table) IS NOT NULL`, pgx.StrictNamedArgs{"table": n.target}).Scan(&p.TargetExists); err != nil || !p.TargetExists {
			return err
		}
		if err := checkTarget(ctx, tx, &spec, n); err != nil {
			return err
		}
		return tx.QueryRow(ctx, fmt.Sprintf(`SELECT count(*) FROM %s`, n.target)).Scan(&p.TargetRows)
	})
	return p, enrichError(spec.Source, err)
}
