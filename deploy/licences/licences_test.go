package licences

import (
	"encoding/json"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// allowed are the licences that a dependency may have, by words that stand in
// their texts. The identifiers are SPDX's.
var allowed = []struct {
	id    string
	words *regexp.Regexp
}{
	{"Apache-2.0", regexp.MustCompile(`(?s)Apache License,? Version 2\.0`)},
	{"BSD-3-Clause", regexp.MustCompile(`(?s)Redistribution and use in source and binary forms.*(Neither the name|names? of .* contributors|endorse or promote)`)},
	{"BSD-2-Clause", regexp.MustCompile(`(?s)Redistribution and use in source and binary forms`)},
	{"MIT", regexp.MustCompile(`(?s)Permission is hereby granted, free of charge, to any person obtaining a copy`)},
	{"ISC", regexp.MustCompile(`(?s)Permission to use, copy, modify, and/or distribute this software for any`)},
	{"MPL-2.0", regexp.MustCompile(`(?s)Mozilla Public License,? [Vv]ersion 2\.0`)},
}

var licenceFile = regexp.MustCompile(`(?i)^(licen[cs]e|copying)([.-].*)?$`)

// licenceOf returns the identifier of the licence of a module in a folder.
func licenceOf(dir string) string {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return ""
	}
	for _, e := range entries {
		if !licenceFile.MatchString(e.Name()) || e.IsDir() {
			continue
		}
		raw, err := os.ReadFile(filepath.Join(dir, e.Name()))
		if err != nil {
			return ""
		}
		for _, l := range allowed {
			if l.words.MatchString(strings.Join(strings.Fields(string(raw)), " ")) {
				return l.id
			}
		}
	}
	return ""
}

// module is what the go command tells of one.
type module struct {
	Path, Version, Dir string
	Main               bool
}

// dependencies are the modules of which a package is linked into the program, or,
// with tests, used by a test.
func dependencies(t *testing.T, args ...string) []module {
	t.Helper()
	cmd := exec.Command("go", append([]string{"list", "-deps", "-f", `{{with .Module}}{{if not .Main}}{"Path":"{{.Path}}","Version":"{{.Version}}","Dir":{{printf "%q" .Dir}}}{{end}}{{end}}`}, args...)...)
	cmd.Dir = ".."
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("go list: %v", err)
	}
	var list []module
	d := json.NewDecoder(strings.NewReader(string(out)))
	for {
		var m module
		if err := d.Decode(&m); err == io.EOF {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		if !slices.Contains(list, m) {
			list = append(list, m)
		}
	}
	slices.SortFunc(list, func(a, b module) int { return strings.Compare(a.Path, b.Path) })
	return list
}

// TestLicences compares LICENCES.txt with the modules that the program links and
// the tests use, and their licences with those that are allowed. Run it with
// NEARMARGIN_WRITE_LICENCES=1 to write the list anew.
func TestLicences(t *testing.T) {
	linked := dependencies(t, "./cmd/nearmargin")
	var b strings.Builder
	for _, m := range dependencies(t, "-test", "./...") {
		id := licenceOf(m.Dir)
		if id == "" {
			t.Errorf("%s has no licence that is allowed", m.Path)
		}
		use := "tests"
		if slices.Contains(linked, m) {
			use = "program"
		}
		b.WriteString(m.Path + " " + m.Version + " " + id + " " + use + "\n")
	}
	const file = "LICENCES.txt"
	if os.Getenv("NEARMARGIN_WRITE_LICENCES") == "1" {
		if err := os.WriteFile(file, []byte(b.String()), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	raw, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if string(raw) != b.String() {
		t.Errorf("%s is not up to date; want\n%s", file, &b)
	}
	if len(linked) < 10 || !strings.Contains(b.String(), "github.com/labstack/echo/v4 v4.16.5 MIT program\n") {
		t.Errorf("%d modules are linked:\n%s", len(linked), &b)
	}
}

// TestLicenceOf: an unknown text and no text are no licence.
func TestLicenceOf(t *testing.T) {
	for _, c := range []struct{ name, file, text, want string }{
		{"MIT", "LICENSE.md", "Permission is hereby granted, free of charge, to any person obtaining a copy of", "MIT"},
		{"GPL", "COPYING", "GNU GENERAL PUBLIC LICENSE Version 3", ""},
		{"no licence", "README", "MIT", ""},
	} {
		dir := t.TempDir()
		if err := os.WriteFile(filepath.Join(dir, c.file), []byte(c.text), 0o600); err != nil {
			t.Fatal(err)
		}
		if got := licenceOf(dir); got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
}
