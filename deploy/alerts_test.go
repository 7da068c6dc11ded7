package deploy

import (
	"io"
	"log/slog"
	"net/http/httptest"
	"os"
	"regexp"
	"strings"
	"testing"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"

	"nearmargin/api"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
)

type alert struct {
	Alert, Expr, For    string
	Labels, Annotations labels
}

type alertFile struct {
	Groups []struct {
		Name  string
		Rules []alert
	}
}

type one struct{ m *setting.Model }

func (o one) Active() *setting.Model             { return o.m }
func (o one) Find(string) (*setting.Model, bool) { return o.m, true }
func (o one) All() []*setting.Model              { return []*setting.Model{o.m} }

// well is a database that answers.
type well struct{}

func (well) Degraded() (time.Time, string) { return time.Time{}, "" }

// metrics are the names and label values that a service with some requests behind
// it has, the suffixes of histograms included.
func metrics(t *testing.T) (names map[string]bool, text string) {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	s := api.New(api.Config{Models: one{b.Model}, Source: well{}, Log: slog.New(slog.NewJSONHandler(io.Discard, nil)), Registry: reg, Version: "1", Commit: "c"})
	for _, target := range []string{"/v1/point?lon=1&lat=2", "/readyz"} {
		s.ServeHTTP(httptest.NewRecorder(), httptest.NewRequest("GET", target, nil))
	}
	w := httptest.NewRecorder()
	s.ServeHTTP(w, httptest.NewRequest("GET", "/metrics", nil))
	names = map[string]bool{"up": true} // up is Prometheus's own
	for line := range strings.Lines(w.Body.String()) {
		if line[0] != '#' {
			names[line[:strings.IndexAny(line, "{ ")]] = true
		}
	}
	return names, w.Body.String()
}

var (
	metricName  = regexp.MustCompile(`\b(?:up|(?:nearmargin|process|go|promhttp)_[a-z0-9_]+)\b`)
	reasonValue = regexp.MustCompile(`reason=~?"([a-z_|-]+)"`)
)

// TestAlerts loads the alert rules and compares what they ask for with what the
// service has. The grammar of expressions is not checked here, but for brackets.
func TestAlerts(t *testing.T) {
	raw, err := os.ReadFile("alerts.yaml")
	if err != nil {
		t.Fatal(err)
	}
	var f alertFile
	if err := strict(raw, &f); err != nil {
		t.Fatal(err)
	}
	names, text := metrics(t)
	seen := map[string]bool{}
	for _, g := range f.Groups {
		for _, a := range g.Rules {
			t.Run(a.Alert, func(t *testing.T) {
				if a.Alert == "" || seen[a.Alert] {
					t.Error("no name of its own")
				}
				seen[a.Alert] = true
				found := metricName.FindAllString(regexp.MustCompile(`"[^"]*"`).ReplaceAllString(a.Expr, `""`), -1)
				if len(found) == 0 {
					t.Errorf("no metric in %q", a.Expr)
				}
				for _, name := range found {
					if !names[name] {
						t.Errorf("there is no metric %s", name)
					}
				}
				for _, m := range reasonValue.FindAllStringSubmatch(a.Expr, -1) {
					for reason := range strings.SplitSeq(m[1], "|") {
						if !strings.Contains(text, `reason="`+reason+`"`) {
							t.Errorf("no metric has the reason %s", reason)
						}
					}
				}
				for _, pair := range []string{"()", "{}", "[]"} {
					if strings.Count(a.Expr, pair[:1]) != strings.Count(a.Expr, pair[1:]) {
						t.Errorf("%s do not match in %q", pair, a.Expr)
					}
				}
				if a.For != "" {
					if _, err := time.ParseDuration(a.For); err != nil {
						t.Error(err)
					}
				}
				if a.Labels["severity"] == "" || a.Annotations["summary"] == "" || a.Annotations["action"] == "" {
					t.Error("severity, summary or action is missing")
				}
			})
		}
	}
	if len(seen) < 5 {
		t.Errorf("%d alerts", len(seen))
	}
}
