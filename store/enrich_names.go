package store

import (
	"fmt"
	"slices"
	"strings"

	"github.com/jackc/pgx/v5"
)

// maxNameBytes is the length at which PostgreSQL cuts a name off.
const maxNameBytes = 63

// enrichNames are the names of a run, quoted for SQL.
type enrichNames struct {
	source, target, runs, changes string
	key, label                    string
	geometry                      string
	extra, columns                []string
}

func quoted(parts ...string) string { return pgx.Identifier(parts).Sanitize() }

// parseTable takes "table" or "schema.table" apart; parts may be in double quotes.
func parseTable(name string) ([]string, error) {
	bad := func(why string) ([]string, error) {
		return nil, fmt.Errorf("%q names no table: %s; want TABLE or SCHEMA.TABLE", name, why)
	}
	var parts []string
	rest := name
	for {
		var part string
		if strings.HasPrefix(rest, `"`) {
			end := 1
			for ; end < len(rest); end++ {
				if rest[end] == '"' {
					if end+1 < len(rest) && rest[end+1] == '"' {
						end++
						continue
					}
					break
				}
			}
			if end >= len(rest) {
				return bad("a quotation mark is not closed")
			}
			part, rest = strings.ReplaceAll(rest[1:end], `""`, `"`), rest[end+1:]
			if rest != "" && rest[0] != '.' {
				return bad("text follows a quoted name")
			}
		} else if i := strings.IndexByte(rest, '.'); i >= 0 {
			part, rest = rest[:i], rest[i:]
		} else {
			part, rest = rest, ""
		}
		if part == "" || strings.IndexByte(part, 0) >= 0 {
			return bad("a part is empty")
		}
		parts = append(parts, part)
		if rest == "" {
			break
		}
		rest = rest[1:]
	}
	if len(parts) > 2 {
		return bad("it has more than two parts")
	}
	return parts, nil
}

// namesOf checks and quotes the names of a spec.
func namesOf(spec *EnrichSpec) (*enrichNames, error) {
	fail := func(err error) (*enrichNames, error) {
		return nil, &Error{Op: "annotate", Ref: spec.Source, Err: err}
	}
	source, err := parseTable(spec.Source)
	if err != nil {
		return fail(err)
	}
	target, err := parseTable(spec.Target)
	if err != nil {
		return fail(err)
	}
	if slices.Equal(source, target) {
		return fail(fmt.Errorf("the answers would go into the table that is read; name another"))
	}
	last := len(target) - 1
	beside := func(ending string) string {
		return quoted(append(slices.Clone(target[:last]), target[last]+ending)...)
	}
	n := &enrichNames{
		source: quoted(source...), target: quoted(target...), runs: beside("_runs"), changes: beside("_changes"),
		key: quoted(spec.Key), geometry: quoted(spec.Geometry), label: quoted(spec.Label),
	}
	all := append([]string{spec.Key, spec.Geometry, target[last] + "_changes"}, spec.Extra...)
	met := map[string]bool{spec.Key: true}
	for _, c := range spec.Columns {
		if met[c.Name] {
			return fail(fmt.Errorf("the target would have two columns %q; choose another prefix", c.Name))
		}
		met[c.Name] = true
		all = append(all, c.Name)
		n.columns = append(n.columns, quoted(c.Name))
	}
	for _, x := range spec.Extra {
		n.extra = append(n.extra, quoted(x))
	}
	for _, x := range all {
		if x == "" || len(x) > maxNameBytes {
			return fail(fmt.Errorf("the name %q must have 1 to %d bytes", x, maxNameBytes))
		}
	}
	return n, nil
}

// literal quotes a value for SQL, for statements that take no parameters. The session
// has standard_conforming_strings on.
func literal(s string) string { return "'" + strings.ReplaceAll(s, "'", "''") + "'" }

// andWhere adds the condition, which is the operator's own; the line break ends a comment in it.
func andWhere(where string) string {
	if strings.TrimSpace(where) == "" {
		return ""
	}
	return "\n  AND (" + where + "\n)"
}

// readSQL reads the rows after a key, in the order of the key.
func (n *enrichNames) readSQL(spec *EnrichSpec, keyType string, after *string) string {
	inner, outer := "", ""
	for i, x := range n.extra {
		inner += fmt.Sprintf(", %s::text AS e%d", x, i)
		outer += fmt.Sprintf(", t.e%d", i)
	}
	from := ""
	if after != nil {
		from = fmt.Sprintf(" AND %s > %s::%s", n.key, literal(*after), keyType)
	}
	return fmt.Sprintf(`COPY (
SELECT t.k::text, w.wkb, w.fault%s FROM (
  SELECT %s AS k, %s::geometry AS g%s FROM %s
  WHERE true%s%s ORDER BY %s
) t, LATERAL pg_temp.nearmargin_wgs84(t.g, %d) w ORDER BY t.k
) TO STDOUT (FORMAT binary)`,
		outer, n.key, n.geometry, inner, n.source, from, andWhere(spec.Where), n.key, spec.MaxPositions)
}
