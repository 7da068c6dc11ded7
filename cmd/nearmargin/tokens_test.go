package main

import (
	"crypto/sha256"
	"fmt"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// TestHangupReloadsTokens rotates a token: at SIGHUP those of the file are valid
// and no others. A file that is at fault changes nothing, and the log says why.
func TestHangupReloadsTokens(t *testing.T) {
	dir := exported(t, "0")
	file := filepath.Join(t.TempDir(), "tokens")
	write := func(text string) {
		t.Helper()
		if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	entry := func(token string) string { return fmt.Sprintf("field query %x\n", sha256.Sum256([]byte(token))) }
	const query = "/v1/point?lon=1&lat=2"
	write(entry("old-secret"))
	r := startWith(t, "--model", dir, "--tokens-file", file, "--tokens", entry("flag-secret"))
	ask := func(token string) int {
		t.Helper()
		req, err := http.NewRequest(http.MethodGet, "http://"+r.address+query, nil)
		if err != nil {
			t.Fatal(err)
		}
		req.Header.Set("Authorization", "Bearer "+token)
		res, err := http.DefaultClient.Do(req)
		if err != nil {
			t.Fatal(err)
		}
		res.Body.Close()
		return res.StatusCode
	}
	steps := []struct {
		name, text       string
		remove           bool
		old, new, ofFlag int
	}{
		{"both while the new one is handed out", entry("old-secret") + entry("new-secret"), false, 200, 200, 200},
		{"a token in place of its sum", "field query leaked-secret\n", false, 200, 200, 200},
		{"a file cut off half way", entry("new-secret")[:40], false, 200, 200, 200},
		{"no file", "", true, 200, 200, 200},
		{"the old one is taken away", entry("new-secret"), false, 401, 200, 200},
		{"none but the flag's", "# none\n", false, 401, 401, 200},
	}
	for i, c := range steps {
		write(c.text)
		if c.remove {
			if err := os.Remove(file); err != nil {
				t.Fatal(err)
			}
		}
		// the model is read after the tokens, so its edition tells that both were
		edition := fmt.Sprint(i + 1)
		change(t, filepath.Join(dir, "model.json"), func(info map[string]any) { info["edition"] = edition })
		if err := syscall.Kill(os.Getpid(), syscall.SIGHUP); err != nil {
			t.Fatal(err)
		}
		waitFor(t, c.name, func() bool {
			_, body := get(t, r.address, "/readyz")
			return strings.Contains(body, `"edition":"`+edition+`"`)
		})
		if o, n, f := ask("old-secret"), ask("new-secret"), ask("flag-secret"); o != c.old || n != c.new || f != c.ofFlag {
			t.Errorf("%s: old %d, new %d, of the flag %d; want %d, %d, %d", c.name, o, n, f, c.old, c.new, c.ofFlag)
		}
	}
	r.stop()
	<-r.status
	log := r.log.String()
	for _, want := range []string{"the tokens were not reloaded; the old ones stay", "not the token", "tokens: line", "no such file", `"tokens":3,"before":2`} {
		if !strings.Contains(log, want) {
			t.Errorf("the log lacks %q:\n%s", want, log)
		}
	}
	if strings.Contains(log, "secret") {
		t.Errorf("the log tells a token:\n%s", log)
	}
}
