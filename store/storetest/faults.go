package storetest

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/url"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/moby/moby/client"
	"github.com/testcontainers/testcontainers-go"
	tcexec "github.com/testcontainers/testcontainers-go/exec"
)

// Pause freezes the server: connections stay, new ones may even be made, and nothing
// is answered. It is thawed at the latest when the test ends.
func (s *Server) Pause(t testing.TB) (resume func()) {
	t.Helper()
	if s.container == nil {
		s.proxy.hold()
		return s.onceAtTheEnd(t, func() error { s.proxy.letGo(); return nil })
	}
	ctx := context.Background()
	c, err := testcontainers.NewDockerClientWithOpts(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := c.ContainerPause(ctx, s.container.GetContainerID(), client.ContainerPauseOptions{}); err != nil {
		t.Fatal(errors.Join(err, c.Close()))
	}
	return s.onceAtTheEnd(t, func() error {
		_, err := c.ContainerUnpause(ctx, s.container.GetContainerID(), client.ContainerUnpauseOptions{})
		return errors.Join(err, c.Close())
	})
}

// onceAtTheEnd returns a function that ends a fault and waits for the server, once; it
// is called when the test ends, if not before.
func (s *Server) onceAtTheEnd(t testing.TB, mend func() error) func() {
	done := false
	end := func() {
		t.Helper()
		if done {
			return
		}
		done = true
		if err := errors.Join(mend(), s.await()); err != nil {
			t.Error(err)
		}
	}
	t.Cleanup(end)
	return end
}

// Direct returns the URL of the same database at the container's own address, so that
// packets to it cross the container's network. The test is skipped where there is no
// such way.
func (s *Server) Direct(t testing.TB, dsn string) string {
	t.Helper()
	if s.container == nil {
		t.Skip("the server is not a container; only a container can be parted from its network")
	}
	u, err := url.Parse(dsn)
	if err != nil {
		t.Fatal(err)
	}
	ip, err := s.container.ContainerIP(context.Background())
	if err != nil || ip == "" {
		t.Skipf("the container has no address of its own: %v", err)
	}
	u.Host = net.JoinHostPort(ip, "5432")
	c, err := net.DialTimeout("tcp", u.Host, 5*time.Second)
	if err != nil {
		t.Skipf("the container's address cannot be reached from here: %v", err)
	}
	_ = c.Close() // it was only tried
	return u.String()
}

// Part has all packets between the container and this machine vanish, in both
// directions and without a word to either: the way back is a black hole within the
// container's network. It needs root, ip and nsenter, without which the test is skipped.
func (s *Server) Part(t testing.TB, direct string) (mend func()) {
	t.Helper()
	u, err := url.Parse(direct)
	if err != nil {
		t.Fatal(err)
	}
	c, err := net.Dial("udp", u.Host) // sends nothing; tells which address we have there
	if err != nil {
		t.Fatal(err)
	}
	ours, _, err := net.SplitHostPort(c.LocalAddr().String())
	_ = c.Close() // it was only asked for its address
	if err != nil {
		t.Fatal(err)
	}
	state, err := s.container.Inspect(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if os.Getuid() != 0 {
		t.Skip("only root can cut a container's network")
	}
	for _, tool := range []string{"nsenter", "ip"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
	route := func(verb string) error {
		out, err := exec.Command("nsenter", "--net", "--target", strconv.Itoa(state.State.Pid), "ip", "route", verb, "blackhole", ours).CombinedOutput() // #nosec G204 -- a test's own container
		if err != nil {
			return fmt.Errorf("ip route %s blackhole %s: %w: %s", verb, ours, err, out)
		}
		return nil
	}
	if err := route("add"); err != nil {
		t.Skipf("the container's network cannot be cut: %v", err)
	}
	return s.onceAtTheEnd(t, func() error { return route("del") })
}

// smallDisk is where a container has a file system of its own for [Server.Small].
const (
	smallDisk   = "/small"
	smallDiskMB = 64
	ballast     = smallDisk + "/ballast"
)

// Small makes a database whose tables are on a disk of 64 MB, for whose tests a
// container is needed. fill leaves no more than a few kB of it; space gives it back.
func (s *Server) Small(t testing.TB) (dsn string, fill, space func()) {
	t.Helper()
	if s.container == nil {
		t.Skip("the server is not a container; only a container has a small disk")
	}
	s.in(t, fmt.Sprintf("mkdir -p %[1]s/space && chown postgres %[1]s/space", smallDisk))
	name := fmt.Sprintf("small_%d", time.Now().UnixNano())
	Exec(t, s.url.String(), "CREATE TABLESPACE "+name+" LOCATION '"+smallDisk+"/space'")
	t.Cleanup(func() { Exec(t, s.url.String(), "DROP TABLESPACE "+name) })
	dsn = s.Empty(t)
	t.Cleanup(func() { s.in(t, "rm -f "+ballast) })
	u, err := url.Parse(dsn)
	if err != nil {
		t.Fatal(err)
	}
	Exec(t, s.url.String(), fmt.Sprintf("ALTER DATABASE %s SET TABLESPACE %s", strings.TrimPrefix(u.Path, "/"), name))
	fill = func() {
		t.Helper()
		s.in(t, fmt.Sprintf("dd if=/dev/zero of=%s bs=4k 2>/dev/null; test -s %[1]s", ballast))
	}
	return dsn, fill, func() { t.Helper(); s.in(t, "rm "+ballast) }
}

// in runs a command of the shell in the container.
func (s *Server) in(t testing.TB, script string) {
	t.Helper()
	status, out, err := s.container.Exec(context.Background(), []string{"sh", "-c", script})
	if err != nil || status != 0 {
		var said []byte
		if out != nil {
			said, _ = io.ReadAll(out)
		}
		t.Fatalf("%s: status %d, %v: %s", script, status, err, said)
	}
}

// Inside runs SQL by psql within the container, whose network may be parted, and returns
// what it prints. The test is skipped where the server is not a container.
func (s *Server) Inside(t testing.TB, dsn, sql string) string {
	t.Helper()
	if s.container == nil {
		t.Skip("the server is not a container")
	}
	u, err := url.Parse(dsn)
	if err != nil {
		t.Fatal(err)
	}
	status, out, err := s.container.Exec(context.Background(), []string{"psql", "-U", user, "-d", strings.TrimPrefix(u.Path, "/"), "-Atc", sql}, tcexec.Multiplexed())
	if err != nil {
		t.Fatal(err)
	}
	said, err := io.ReadAll(out)
	if err != nil || status != 0 {
		t.Fatalf("%s: status %d, %v: %s", sql, status, err, said)
	}
	return strings.TrimSpace(string(said))
}
