package store

import (
	"context"
	"encoding/json"
	"strings"
	"testing"
	"testing/fstest"

	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
	"nearmargin/store/storetest"
)

// model returns the built-in model under another edition, so that there is more
// than one.
func model(t testing.TB, edition string) *bundle.Bundle {
	t.Helper()
	return edited(t, func(dir fstest.MapFS) {
		var info map[string]any
		if err := json.Unmarshal(dir["model.json"].Data, &info); err != nil {
			t.Fatal(err)
		}
		info["edition"] = edition
		raw, err := json.Marshal(info)
		if err != nil {
			t.Fatal(err)
		}
		dir["model.json"].Data = raw
	})
}

// edited returns the built-in model after a change to its canonical files.
func edited(t testing.TB, change func(dir fstest.MapFS)) *bundle.Bundle {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	dir := fstest.MapFS{}
	for _, name := range b.Files() {
		dir[name] = &fstest.MapFile{Data: b.File(name)}
	}
	change(dir)
	out, err := bundle.Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestMain(m *testing.M) { storetest.Main(m) }

// migrated makes a database with the schema and returns its URL.
func migrated(t testing.TB) string {
	t.Helper()
	url := storetest.Get(t).Empty(t)
	if _, err := Migrate(context.Background(), url); err != nil {
		t.Fatal(err)
	}
	return url
}

// opened connects until the test ends.
func opened(t testing.TB, url string) *Store {
	t.Helper()
	s, err := Connect(context.Background(), url)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = s.Close(context.Background()) })
	return s
}

func imported(t testing.TB, url string, bundles ...*bundle.Bundle) *Store {
	t.Helper()
	s := opened(t, url)
	for _, b := range bundles {
		if err := s.Import(context.Background(), b); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

// sameFiles compares two models file by file.
func sameFiles(t testing.TB, got, want *bundle.Bundle) {
	t.Helper()
	if g, w := strings.Join(got.Files(), " "), strings.Join(want.Files(), " "); g != w {
		t.Fatalf("files %s, want %s", g, w)
	}
	for _, name := range want.Files() {
		if string(got.File(name)) != string(want.File(name)) {
			t.Errorf("%s differs", name)
		}
	}
	if got.Model.SHA256() != want.Model.SHA256() {
		t.Errorf("checksum %s, want %s", got.Model.SHA256(), want.Model.SHA256())
	}
}
