package page_test

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"net"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
	"github.com/prometheus/client_golang/prometheus"

	"nearmargin/api"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
)

// only is the Models of a server with one model.
type only struct{ m *setting.Model }

func (o only) Active() *setting.Model { return o.m }
func (o only) All() []*setting.Model  { return []*setting.Model{o.m} }
func (o only) Find(ref string) (*setting.Model, bool) {
	return o.m, ref == o.m.ID() || ref == o.m.Ref()
}

// newHandler returns the whole service on the built-in model.
func newHandler(t *testing.T, with ...func(*api.Config)) http.Handler {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	c := api.Config{Models: only{b.Model}, Log: slog.New(slog.NewTextHandler(io.Discard, nil)), Registry: prometheus.NewRegistry(), Version: "0", Commit: "0"}
	for _, f := range with {
		f(&c)
	}
	return api.New(c)
}

// host is a service that can go away and come back at the same address.
type host struct {
	t       *testing.T
	handler http.Handler
	addr    string
	path    string // of the page, with a slash at the end
	srv     *http.Server
}

func newHost(t *testing.T, with ...func(*api.Config)) *host {
	h := &host{t: t, handler: newHandler(t, with...), addr: "127.0.0.1:0", path: "/"}
	h.start()
	t.Cleanup(h.stop)
	return h
}

func (h *host) start() {
	h.t.Helper()
	l, err := net.Listen("tcp", h.addr)
	if err != nil {
		h.t.Fatal(err)
	}
	h.addr = l.Addr().String()
	h.srv = &http.Server{Handler: h.handler}
	go func(s *http.Server) { _ = s.Serve(l) }(h.srv)
}

func (h *host) stop() { _ = h.srv.Close() }

// tab is one tab of a browser, with what its console said.
type tab struct {
	t    *testing.T
	ctx  context.Context
	url  string // of the host
	path string

	mu      sync.Mutex
	console []string
}

// chromium returns the browser's path. Without one the test is skipped, or fails
// where tools are required.
func chromium(t *testing.T) string {
	t.Helper()
	if testing.Short() {
		t.Skip("-short: no browser is started")
	}
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if path, err := exec.LookPath(name); err == nil {
			return path
		}
	}
	const lacking = "chromium is not installed; on Debian: apt-get install chromium"
	if os.Getenv("NEARMARGIN_REQUIRE_TOOLS") == "1" {
		t.Fatal(lacking)
	}
	t.Skip(lacking)
	return ""
}

// newTab opens a browser with a window of a size, and the page with a fragment.
func newTab(t *testing.T, h *host, width, height int, dark bool, fragment string) *tab {
	t.Helper()
	opts := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(chromium(t)), chromedp.NoSandbox,
		chromedp.WindowSize(width, height), chromedp.Flag("disable-dev-shm-usage", true), chromedp.Flag("hide-scrollbars", false))
	actx, stopBrowser := chromedp.NewExecAllocator(context.Background(), opts...)
	t.Cleanup(stopBrowser)
	ctx, closeTab := chromedp.NewContext(actx)
	t.Cleanup(closeTab)
	ctx, cancel := context.WithTimeout(ctx, 5*time.Minute)
	t.Cleanup(cancel)
	b := &tab{t: t, ctx: ctx, url: "http://" + h.addr, path: h.path}
	chromedp.ListenTarget(ctx, b.listen)
	scheme := "light"
	if dark {
		scheme = "dark"
	}
	if fragment == noScript {
		b.run(emulation.SetScriptExecutionDisabled(true))
	}
	b.run(log.Enable(), emulation.SetDeviceMetricsOverride(int64(width), int64(height), 1, width < 500),
		emulation.SetEmulatedMedia().WithFeatures([]*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: scheme}}),
		chromedp.Navigate(b.url+b.path+fragment))
	if !strings.HasPrefix(fragment, noScript) && fragment != referencePage {
		b.wait("the page is ready", `document.documentElement.dataset.ready === "yes"`)
	}
	return b
}

// noScript as a fragment opens the page without JavaScript.
const noScript = "?no-script"

// referencePage as a fragment opens the reference page, which has no script.
const referencePage = "reference"

func (b *tab) listen(ev any) {
	b.mu.Lock()
	defer b.mu.Unlock()
	switch e := ev.(type) {
	case *runtime.EventConsoleAPICalled:
		if e.Type == runtime.APITypeError || e.Type == runtime.APITypeWarning {
			for _, a := range e.Args {
				b.console = append(b.console, string(a.Value)+a.Description)
			}
		}
	case *runtime.EventExceptionThrown:
		b.console = append(b.console, e.ExceptionDetails.Error())
	case *log.EventEntryAdded:
		if e.Entry.Level == log.LevelError || e.Entry.Level == log.LevelWarning {
			b.console = append(b.console, e.Entry.Text+" "+e.Entry.URL)
		}
	}
}

// quiet fails where the console said anything that is not expected.
func (b *tab) quiet(expected ...string) {
	b.t.Helper()
	b.mu.Lock()
	defer b.mu.Unlock()
next:
	for _, line := range b.console {
		for _, e := range expected {
			if strings.Contains(line, e) {
				continue next
			}
		}
		b.t.Errorf("console: %s", line)
	}
}

func (b *tab) run(actions ...chromedp.Action) {
	b.t.Helper()
	if err := chromedp.Run(b.ctx, actions...); err != nil {
		b.t.Fatal(err)
	}
}

// wait waits until an expression is true in the page, across navigations too.
func (b *tab) wait(what, expression string) {
	b.t.Helper()
	var err error
	for end := time.Now().Add(time.Minute); time.Now().Before(end); time.Sleep(50 * time.Millisecond) {
		ctx, cancel := context.WithTimeout(b.ctx, 10*time.Second)
		var ok bool
		err = chromedp.Run(ctx, chromedp.Evaluate("Boolean("+expression+")", &ok)) // fails while a page is left for another
		cancel()
		if ok && err == nil {
			return
		}
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	var seen string
	ctx, cancel := context.WithTimeout(b.ctx, 10*time.Second)
	defer cancel()
	seenErr := chromedp.Run(ctx, chromedp.Evaluate("location.pathname + ', ' + document.readyState + ', the panel says ' + document.querySelector('#panel')?.innerText", &seen))
	b.t.Fatalf("%s: not so (%v); the page: %.300q (%v); console %q", what, err, seen, seenErr, b.console)
}

// eval evaluates an expression that gives a T; a promise is awaited.
func eval[T any](b *tab, expression string) T {
	b.t.Helper()
	var out T
	err := chromedp.Run(b.ctx, chromedp.Evaluate(expression, &out, func(p *runtime.EvaluateParams) *runtime.EvaluateParams { return p.WithAwaitPromise(true) }))
	if err != nil {
		b.t.Fatalf("%.120s: %v", expression, err)
	}
	return out
}

func textOf(b *tab, selector string) string {
	return eval[string](b, fmt.Sprintf("document.querySelector(%q).innerText", selector))
}

// heading waits for the panel's heading.
func (b *tab) heading(want string) {
	b.t.Helper()
	b.wait("the heading "+want, fmt.Sprintf(`document.querySelector("#panel h2").textContent === %q`, want))
}

// shot keeps a picture of the window where NEARMARGIN_SHOTS names a directory.
func (b *tab) shot(name string) {
	b.t.Helper()
	dir := os.Getenv("NEARMARGIN_SHOTS")
	if dir == "" {
		return
	}
	var png []byte
	b.run(chromedp.Sleep(400*time.Millisecond), chromedp.CaptureScreenshot(&png))
	if err := errors.Join(os.MkdirAll(dir, 0o755), os.WriteFile(filepath.Join(dir, name+".png"), png, 0o644)); err != nil {
		b.t.Fatal(err)
	}
}
