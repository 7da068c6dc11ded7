package api

import (
	"net/http"
	"time"

	"github.com/labstack/echo/v4"
	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/promhttp"

	"nearmargin/api/annotate"
)

// metrics counts what operations want to see.
type metrics struct {
	requests *prometheus.CounterVec
	seconds  *prometheus.HistogramVec
	rows     *prometheus.CounterVec
	faults   *prometheus.CounterVec
	cut      *prometheus.CounterVec
	refused  *prometheus.CounterVec
	panics   prometheus.Counter
}

// newMetrics registers the metrics.
func newMetrics(cfg Config) *metrics {
	m := &metrics{
		requests: prometheus.NewCounterVec(prometheus.CounterOpts{
			Name: "nearmargin_http_requests_total", Help: "Requests answered, by route, method and status (aborted: the answer was broken off).",
		}, []string{"route", "method", "status"}),
		seconds: prometheus.NewHistogramVec(prometheus.HistogramOpts{
			Name: "nearmargin_http_request_duration_seconds", Help: "Time from the request's header to the end of its answer.",
			Buckets: []float64{.0001, .00025, .0005, .001, .0025, .005, .01, .05, .1, .5, 1, 5, 30, 120},
		}, []string{"route"}),
		rows: prometheus.NewCounterVec(prometheus.CounterOpts{
			Name: "nearmargin_annotated_rows_total", Help: "Rows and features annotated, by format.",
		}, []string{"format"}),
		faults: prometheus.NewCounterVec(prometheus.CounterOpts{
			Name: "nearmargin_annotated_row_errors_total", Help: "Rows and features that got an error instead of an answer, by format.",
		}, []string{"format"}),
	}
	m.operations()
	info := prometheus.NewGaugeVec(prometheus.GaugeOpts{
		Name: "nearmargin_build_info", Help: "Always 1; the labels say which program runs.",
	}, []string{"version", "commit"})
	info.WithLabelValues(cfg.Version, cfg.Commit).Set(1)
	cfg.Registry.MustRegister(m.requests, m.seconds, m.rows, m.faults, m.cut, m.refused, m.panics, info)
	if cfg.Source != nil {
		cfg.Registry.MustRegister(prometheus.NewGaugeFunc(prometheus.GaugeOpts{
			Name: "nearmargin_degraded_since_timestamp_seconds", Help: "Since when newer models cannot be had, in seconds since 1970; 0 where they can.",
		}, func() float64 {
			since, _ := cfg.Source.Degraded()
			if since.IsZero() {
				return 0
			}
			return float64(since.UnixMilli()) / 1000
		}))
	}
	return m
}

var knownMethods = map[string]bool{
	http.MethodGet: true, http.MethodHead: true, http.MethodPost: true, http.MethodPut: true,
	http.MethodDelete: true, http.MethodPatch: true, http.MethodOptions: true,
}

func (m *metrics) request(route, method, status string, took time.Duration) {
	if !knownMethods[method] {
		method = "other"
	}
	m.requests.WithLabelValues(route, method, status).Inc()
	m.seconds.WithLabelValues(route).Observe(took.Seconds())
}

func (m *metrics) batch(format string, st annotate.Stats) {
	m.rows.WithLabelValues(format).Add(float64(st.Rows))
	m.faults.WithLabelValues(format).Add(float64(st.Errors))
}

func (m *metrics) handler(reg *prometheus.Registry) echo.HandlerFunc {
	return echo.WrapHandler(promhttp.HandlerFor(reg, promhttp.HandlerOpts{}))
}
