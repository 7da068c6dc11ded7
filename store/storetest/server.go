// Package storetest gives tests a real PostGIS: the server that
// NEARMARGIN_TEST_DATABASE_URL names, else a container where a container engine
// answers. Where there is neither the test is skipped, or fails where
// NEARMARGIN_REQUIRE_DATABASE is 1.
//
// The image is postgis/postgis, or that of NEARMARGIN_TEST_POSTGIS_IMAGE.
// Production code must not import this package.
package storetest

import (
	"context"
	"errors"
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"os"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/moby/moby/api/types/container"
	"github.com/moby/moby/api/types/network"
	"github.com/testcontainers/testcontainers-go"
)

const (
	defaultImage = "postgis/postgis"
	user         = "postgres"
	password     = "nearmargin"
	startTimeout = 3 * time.Minute
	port         = "5432/tcp"
)

// Server is one PostgreSQL server with PostGIS.
type Server struct {
	url       *url.URL
	container testcontainers.Container // nil where the server is not ours
	proxy     *proxy                   // in front of a server that is not ours
}

var shared struct {
	sync.Once
	server *Server
	err    error
}

// Main runs a package's tests and ends the container that they shared. Call it from
// TestMain.
func Main(m *testing.M) {
	status := m.Run()
	if s := shared.server; s != nil && s.container != nil {
		if err := testcontainers.TerminateContainer(s.container); err != nil {
			fmt.Fprintln(os.Stderr, "storetest:", err)
		}
	}
	os.Exit(status)
}

// Get returns the server that the tests of a package share.
func Get(t testing.TB) *Server {
	t.Helper()
	shared.Do(func() { shared.server, shared.err = start() })
	if shared.err == nil {
		return shared.server
	}
	text := fmt.Sprintf("no PostGIS to test with: %v; start a container engine, or set NEARMARGIN_TEST_DATABASE_URL to a server where databases may be made", shared.err)
	if os.Getenv("NEARMARGIN_REQUIRE_DATABASE") == "1" {
		t.Fatal(text)
	}
	t.Skip(text)
	return nil
}

func start() (*Server, error) {
	given := os.Getenv("NEARMARGIN_TEST_DATABASE_URL")
	if given == "" {
		return startContainer()
	}
	u, err := url.Parse(given)
	if err != nil {
		return nil, fmt.Errorf("NEARMARGIN_TEST_DATABASE_URL: %w", err)
	}
	p, err := newProxy(u.Host)
	if err != nil {
		return nil, err
	}
	u.Host = p.address()
	s := &Server{url: u, proxy: p}
	return s, s.await()
}

func startContainer() (s *Server, err error) {
	defer func() { // the library panics where it finds no engine
		if r := recover(); r != nil {
			err = fmt.Errorf("no container engine: %v", r)
		}
	}()
	image := os.Getenv("NEARMARGIN_TEST_POSTGIS_IMAGE")
	if image == "" {
		image = defaultImage
	}
	// A port of its own, which the container keeps when it is stopped and started.
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return nil, err
	}
	host := l.Addr().(*net.TCPAddr)
	if err := l.Close(); err != nil {
		return nil, err
	}
	ctx, cancel := context.WithTimeout(context.Background(), startTimeout)
	defer cancel()
	c, err := testcontainers.Run(ctx, image,
		testcontainers.WithExposedPorts(port),
		testcontainers.WithEnv(map[string]string{"POSTGRES_PASSWORD": password}),
		testcontainers.WithHostConfigModifier(func(h *container.HostConfig) {
			h.Tmpfs = map[string]string{smallDisk: fmt.Sprintf("size=%dm,mode=0755", smallDiskMB)}
			h.PortBindings = network.PortMap{network.MustParsePort(port): {{HostIP: netip.MustParseAddr("127.0.0.1"), HostPort: strconv.Itoa(host.Port)}}}
		}))
	if err != nil {
		return nil, errors.Join(err, testcontainers.TerminateContainer(c))
	}
	s = &Server{container: c, url: &url.URL{Scheme: "postgres", User: url.UserPassword(user, password), Host: host.String(), Path: "/postgres", RawQuery: "sslmode=disable"}}
	if err = s.await(); err == nil {
		err = s.hurry(ctx)
	}
	if err != nil {
		return nil, errors.Join(err, testcontainers.TerminateContainer(c))
	}
	return s, nil
}

// hurry switches off what keeps data through a loss of power.
func (s *Server) hurry(ctx context.Context) error {
	conn, err := pgx.Connect(ctx, s.url.String())
	if err != nil {
		return err
	}
	defer conn.Close(ctx)
	for _, sql := range [...]string{`ALTER SYSTEM SET fsync = off`, `ALTER SYSTEM SET full_page_writes = off`, `SELECT pg_reload_conf()`} {
		if _, err := conn.Exec(ctx, sql); err != nil {
			return fmt.Errorf("%s: %w", sql, err)
		}
	}
	return nil
}

// await waits until the server answers.
func (s *Server) await() error {
	ctx, cancel := context.WithTimeout(context.Background(), startTimeout)
	defer cancel()
	for {
		conn, err := pgx.Connect(ctx, s.url.String())
		if err == nil {
			err = errors.Join(conn.Ping(ctx), conn.Close(ctx))
		}
		if err == nil {
			return nil
		}
		select {
		case <-ctx.Done():
			return fmt.Errorf("the server does not answer: %w", err)
		case <-time.After(100 * time.Millisecond):
		}
	}
}

// Stop takes the server away: connections break and new ones are refused.
func (s *Server) Stop(t testing.TB) {
	t.Helper()
	if s.container == nil {
		s.proxy.cut()
		return
	}
	second := 10 * time.Second
	if err := s.container.Stop(context.Background(), &second); err != nil {
		t.Fatal(err)
	}
}

// Start brings the server back.
func (s *Server) Start(t testing.TB) {
	t.Helper()
	if s.container == nil {
		s.proxy.mend()
	} else if err := s.container.Start(context.Background()); err != nil {
		t.Fatal(err)
	}
	if err := s.await(); err != nil {
		t.Fatal(err)
	}
}

// Conn opens a connection of the test's own.
func Conn(t testing.TB, url string) *pgx.Conn {
	t.Helper()
	conn, err := pgx.Connect(context.Background(), url)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = conn.Close(context.Background()) })
	return conn
}

// Exec runs one statement as the owner.
func Exec(t testing.TB, url, sql string, args ...any) {
	t.Helper()
	conn, err := pgx.Connect(context.Background(), url)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close(context.Background())
	if _, err := conn.Exec(context.Background(), sql, args...); err != nil {
		t.Fatalf("%s: %v", sql, err)
	}
}

// Empty makes a database that holds nothing, gone when the test ends, and returns
// its URL.
func (s *Server) Empty(t testing.TB) string {
	t.Helper()
	return s.create(t, "template1")
}

// Copy makes a copy of a database to which nobody is connected, gone when the test
// ends, and returns its URL.
func (s *Server) Copy(t testing.TB, of string) string {
	t.Helper()
	u, err := url.Parse(of)
	if err != nil {
		t.Fatal(err)
	}
	return s.create(t, strings.TrimPrefix(u.Path, "/"))
}

func (s *Server) create(t testing.TB, template string) string {
	t.Helper()
	name := fmt.Sprintf("nearmargin_test_%d", time.Now().UnixNano())
	Exec(t, s.url.String(), "CREATE DATABASE "+pgx.Identifier{name}.Sanitize()+" TEMPLATE "+pgx.Identifier{template}.Sanitize())
	t.Cleanup(func() { Exec(t, s.url.String(), "DROP DATABASE "+pgx.Identifier{name}.Sanitize()+" WITH (FORCE)") })
	u := *s.url
	u.Path = "/" + name
	return u.String()
}

// As returns the URL of the same database for another role.
func As(t testing.TB, dsn, role, password string) string {
	t.Helper()
	u, err := url.Parse(dsn)
	if err != nil {
		t.Fatal(err)
	}
	u.User = url.UserPassword(role, password)
	return u.String()
}
