package store

import (
	"slices"
	"testing"
)

func TestParseTable(t *testing.T) {
	for name, want := range map[string][]string{
		"wells":            {"wells"},
		"field.wells":      {"field", "wells"},
		`"a.b".c`:          {"a.b", "c"},
		`"a""b"."c"`:       {`a"b`, "c"},
		`Mixed Case`:       {"Mixed Case"},
		"a;DROP TABLE b--": {"a;DROP TABLE b--"}, // a name, to be quoted
		"":                 nil, ".a": nil, "a.": nil, "a..b": nil, "a.b.c": nil, `"a`: nil, `"a"b`: nil, `""`: nil, "a\x00": nil,
	} {
		got, err := parseTable(name)
		if (err == nil) != (want != nil) || !slices.Equal(got, want) {
			t.Errorf("%q: %q, %v, want %q", name, got, err, want)
		}
	}
}

// FuzzParseTable quotes what was read and reads it again.
func FuzzParseTable(f *testing.F) {
	for _, s := range []string{"wells", "a.b", `"a.b"."c""d"`, `"`, "a..b", `a"b`} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, name string) {
		parts, err := parseTable(name)
		if err != nil {
			return
		}
		if again, err := parseTable(quoted(parts...)); err != nil || !slices.Equal(again, parts) {
			t.Errorf("%q gave %q, quoted %s gave %q, %v", name, parts, quoted(parts...), again, err)
		}
	})
}
