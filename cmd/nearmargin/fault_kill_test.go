package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"

	"nearmargin/store/storetest"
)

// TestKilledInABatch kills a service while a batch is under way. The client must be
// able to tell, and every whole line that it has must be right.
func TestKilledInABatch(t *testing.T) {
	const sent, all = 20_000, 24_000
	after := startProcess(t)
	for _, f := range tables {
		t.Run(f.name, func(t *testing.T) {
			p := startProcess(t)
			in, out := io.Pipe()
			defer out.Close()
			go io.WriteString(out, f.before+f.rows(0, sent)) // the rest never comes
			res, err := http.Post(p.url("/v1/annotate"), f.contentType, in)
			if err != nil {
				t.Fatal(err)
			}
			defer res.Body.Close()
			got := make([]byte, 50_000)
			if _, err := io.ReadFull(res.Body, got); err != nil {
				t.Fatal(err)
			}
			p.kill()
			rest, err := io.ReadAll(res.Body)
			if err == nil || len(res.Trailer.Get("Nearmargin-Rows")) > 0 {
				t.Errorf("the answer ends as if it were whole: %v, trailers %v", err, res.Trailer)
			}
			got = append(got, rest...)
			if f.name == "geojson" && json.Valid(got) {
				t.Error("half an answer is a whole document")
			}
			want := f.annotate(t, after.address, f.whole(all))
			lines := string(got[:bytes.LastIndexByte(got, '\n')+1])
			if !strings.HasPrefix(want, lines) || strings.Count(lines, "\n") < 20 || strings.Count(lines, "\n") >= sent {
				t.Errorf("%d lines; want the first lines of the whole answer", strings.Count(lines, "\n"))
			}
		})
	}
}

// recipesBelow are the scripts of INTEGRATING.md below a heading.
func recipesBelow(t *testing.T, heading string) []string {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(root, "api", "INTEGRATING.md"))
	if err != nil {
		t.Fatal(err)
	}
	_, text, ok := strings.Cut(string(raw), "\n## "+heading+"\n")
	if !ok {
		t.Fatalf("INTEGRATING.md has no %q", heading)
	}
	text, _, _ = strings.Cut(text, "\n## ")
	var out []string
	for _, b := range fenced.FindAllStringSubmatch(text, -1) {
		out = append(out, b[2])
	}
	return out
}

// TestRecipesTakeUpWhereAKillLeftThem runs each recipe for an answer that breaks off
// against a service that is killed in the middle and started again. The result must be
// the same as that of an undisturbed run, byte for byte.
func TestRecipesTakeUpWhereAKillLeftThem(t *testing.T) {
	for _, tool := range []string{"sh", "curl"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
	scripts := recipesBelow(t, "When an answer breaks off")
	if len(scripts) != len(tables) {
		t.Fatalf("%d recipes, want one for each of %d formats", len(scripts), len(tables))
	}
	address := freeAddress(t)
	for i, f := range tables {
		t.Run(f.name, func(t *testing.T) {
			p := startProcess(t, "--listen", address)
			rows := 40_000
			if testing.Short() {
				rows = 12_000
			}
			input := f.whole(rows)
			want := f.annotate(t, address, input)
			dir := t.TempDir()
			if err := os.WriteFile(filepath.Join(dir, "sites."+f.name), []byte(input), 0o600); err != nil {
				t.Fatal(err)
			}
			if !strings.Contains(scripts[i], "sites."+f.name) {
				t.Fatalf("recipe %d is not one for %s", i+1, f.name)
			}
			c := exec.Command("sh", "-eu", "-c", strings.ReplaceAll(scripts[i], "127.0.0.1:8080", address))
			c.Dir = dir
			var said bytes.Buffer
			c.Stdout, c.Stderr = &said, &said
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			// the kill comes when answers have arrived
			waitFor(t, "the first answers", func() bool { return size(filepath.Join(dir, "annotated."+f.name+"*")) > 0 })
			got := size(filepath.Join(dir, "annotated."+f.name+"*"))
			p.kill()
			startProcess(t, "--listen", address)
			if err := c.Wait(); err != nil {
				t.Fatalf("%v: %s", err, &said)
			}
			have, err := os.ReadFile(filepath.Join(dir, "annotated."+f.name))
			if err != nil || string(have) != want {
				t.Errorf("%v; the result has %d bytes, an undisturbed one %d", err, len(have), len(want))
			}
			t.Logf("killed after %d of %d bytes", got, len(want))
			if got >= int64(len(want)) {
				t.Error("the kill came too late to disturb anything")
			}
		})
	}
}

// size is that of the largest file of a pattern.
func size(pattern string) (most int64) {
	list, _ := filepath.Glob(pattern) // the pattern is sound
	for _, name := range list {
		if st, err := os.Stat(name); err == nil {
			most = max(most, st.Size())
		}
	}
	return most
}

// TestAnnotateKilled kills the command while it writes.
func TestAnnotateKilled(t *testing.T) {
	f := tables[0]
	const sent, all = 20_000, 30_000
	want := invoke(t, nil, f.whole(all), "annotate").stdout
	dir := t.TempDir()
	out := filepath.Join(dir, "out.csv")
	if err := os.WriteFile(out, []byte("the result before\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	// begin starts the command, gives it a part of the rows, and kills it when some
	// answers are there.
	begin := func(t *testing.T, stdout io.Writer, grown func() bool, args ...string) {
		c := programCommand(t, append([]string{"annotate", "-"}, args...)...)
		in, err := c.StdinPipe()
		if err != nil {
			t.Fatal(err)
		}
		var errs bytes.Buffer
		c.Stdout, c.Stderr = stdout, &errs
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		go io.WriteString(in, f.before+f.rows(0, sent))
		waitFor(t, "the first answers", grown)
		if err := c.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		if err := c.Wait(); err == nil || c.ProcessState.ExitCode() != -1 {
			t.Errorf("it ended with %v before it was killed", err)
		}
		checkLog(t, errs.String())
	}
	t.Run("to a file", func(t *testing.T) {
		pattern := filepath.Join(dir, ".out.csv.*"+unfinished)
		begin(t, nil, func() bool { return size(pattern) > 100_000 }, "--out", out)
		if raw, err := os.ReadFile(out); err != nil || string(raw) != "the result before\n" {
			t.Errorf("%v, the file holds %.100q; want what it held before", err, raw)
		}
		left, _ := os.ReadDir(dir)
		if len(left) != 2 || size(pattern) == 0 {
			t.Errorf("left are %v; want the result and one unfinished file", left)
		}
		again := programCommand(t, "annotate", "-", "--out", out)
		again.Stdin = strings.NewReader(f.whole(all))
		if msg, err := again.CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, msg)
		}
		if raw, err := os.ReadFile(out); err != nil || string(raw) != want {
			t.Errorf("%v, the run after it wrote %d bytes, want %d", err, len(raw), len(want))
		}
	})
	t.Run("to standard output", func(t *testing.T) {
		name := filepath.Join(t.TempDir(), "redirected.csv")
		file, err := os.Create(name)
		if err != nil {
			t.Fatal(err)
		}
		defer file.Close()
		begin(t, file, func() bool { return size(name) > 100_000 })
		raw, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		lines := string(raw[:bytes.LastIndexByte(raw, '\n')+1])
		if n := strings.Count(lines, "\n"); !strings.HasPrefix(want, lines) || n < 100 || n >= all {
			t.Errorf("%d lines; want the first ones of the whole result", n)
		}
	})
}

// inventory is what a database holds: rows by table, and the list of editions.
func inventory(t *testing.T, url string, conn *pgx.Conn) string {
	t.Helper()
	var rows string
	for _, name := range []string{"models", "editions", "activations", "plates", "boundaries", "junctions", "motion_models",
		"angular_velocities", "zones", "hotspots", "land", "warnings", "slabs", "slab_boundaries", "slab_contours", "slab_grids"} {
		rows += fmt.Sprintf("%s %d\n", name, countRows(t, conn, "SELECT count(*) FROM nearmargin."+name))
	}
	return rows + must(t, url, "model", "list")
}

func countRows(t *testing.T, conn *pgx.Conn, sql string) (n int) {
	t.Helper()
	if err := conn.QueryRow(t.Context(), sql).Scan(&n); err != nil {
		t.Fatal(err)
	}
	return n
}

// importing counts the connections of the program to a test's database.
const importingSQL = `SELECT count(*) FROM pg_stat_activity WHERE datname = current_database() AND application_name = 'nearmargin'`

// TestKilledInAnImport kills imports at several moments: one held up between two
// tables, and some that run freely.
func TestKilledInAnImport(t *testing.T) {
	url, first := seeded(t)
	dir := exported(t, "other")
	conn := storetest.Conn(t, url)
	before := inventory(t, url, conn)
	p := startProcess(t, "--database", url)
	start := func() *exec.Cmd {
		c := programCommand(t, "model", "import", dir, "--database", url)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		return c
	}
	// The service's own connection is one; it stays.
	gone := func() bool { return countRows(t, conn, importingSQL) == 1 }

	ctx := t.Context()
	tx, err := storetest.Conn(t, url).Begin(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tx.Exec(ctx, `LOCK TABLE nearmargin.slab_contours IN ACCESS EXCLUSIVE MODE`); err != nil {
		t.Fatal(err)
	}
	c := start()
	waitFor(t, "the import to stand at the lock", func() bool {
		return countRows(t, conn, importingSQL+` AND wait_event_type = 'Lock'`) == 1
	})
	c.Process.Kill()
	c.Wait()
	if err := tx.Rollback(ctx); err != nil {
		t.Fatal(err)
	}
	waitFor(t, "the server to see it", gone)
	if now := inventory(t, url, conn); now != before {
		t.Errorf("after a kill the database holds\n%s\nbefore\n%s", now, before)
	}

	done := 0
	for i := range 10 {
		c := start()
		time.Sleep(time.Duration(i*i) * 25 * time.Millisecond)
		c.Process.Kill()
		c.Wait()
		waitFor(t, "the server to see it", gone)
		if now := inventory(t, url, conn); now == before {
			continue
		}
		// The import was over before the kill: it must be there whole.
		if done++; !strings.Contains(must(t, url, "model", "diff", dir, "builtin@other"), "nothing changed") {
			t.Error("half an edition is there")
		}
		break
	}
	t.Logf("%d of the imports were done before the kill", done)
	if done == 0 {
		must(t, url, "model", "import", dir)
	}
	if _, body := get(t, p.address, "/readyz"); !strings.Contains(body, strings.TrimPrefix(first, "builtin@")) {
		t.Errorf("the service answers from another edition: %s", body)
	}
	must(t, url, "model", "activate", "builtin@other")
	waitFor(t, "the edition to be served", func() bool {
		_, body := get(t, p.address, "/readyz")
		return strings.Contains(body, `"edition":"other"`)
	})
}

// TestImportWhoseMachineVanishes stops an import in the middle and has every packet to
// and from it vanish, as when its machine loses power. The server must give up the
// import, and with it the lock that keeps others from importing.
func TestImportWhoseMachineVanishes(t *testing.T) {
	if testing.Short() {
		t.Skip("waits for the server's timeouts")
	}
	server := storetest.Get(t)
	url := server.Empty(t)
	direct := server.Direct(t, url)
	must(t, url, "migrate")
	locked := make(chan string, 1)
	go func() {
		locked <- server.Inside(t, url, `BEGIN; LOCK TABLE nearmargin.slab_contours IN ACCESS EXCLUSIVE MODE; SELECT pg_sleep(10); COMMIT`)
	}()
	waitFor(t, "the lock", func() bool {
		return server.Inside(t, url, `SELECT count(*) FROM pg_locks WHERE relation = 'nearmargin.slab_contours'::regclass`) == "1"
	})
	c := programCommand(t, "model", "import", "builtin", "--database", direct)
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	defer c.Wait()
	defer c.Process.Kill()
	importing := func() string { return server.Inside(t, url, importingSQL) }
	waitFor(t, "the import to stand at the lock", func() bool {
		return server.Inside(t, url, importingSQL+` AND wait_event_type = 'Lock'`) == "1"
	})
	mend := server.Part(t, direct)
	if err := c.Process.Signal(syscall.SIGSTOP); err != nil {
		t.Fatal(err)
	}
	start := time.Now()
	<-locked
	for end := start.Add(100 * time.Second); importing() != "0"; time.Sleep(500 * time.Millisecond) {
		if time.Now().After(end) {
			t.Fatal("the server still holds the import")
		}
	}
	t.Logf("the server gave the import up after %v", time.Since(start).Round(time.Second))
	mend()
	c.Process.Kill()
	if n := server.Inside(t, url, `SELECT count(*) FROM nearmargin.editions`); n != "0" {
		t.Errorf("%s editions", n)
	}
	must(t, url, "model", "import", "builtin")
}
