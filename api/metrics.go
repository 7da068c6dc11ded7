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
		Name: "nearmargin_build_info", Help: "Always 1; the labels say what runs and the model it started with.",
	}, []string{"version", "commit", "model"})
	info.WithLabelValues(cfg.Version, cfg.Commit, cfg.Models.Active().Ref()).Set(1)
	cfg.Registry.MustRegister(m.requests, m.seconds, m.rows, m.faults, m.cut, m.refused, m.panics, info, activeModel{cfg.Models})
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

// activeModel tells which model is active at the time of asking.
type activeModel struct{ models Models }

var activeModelDesc = prometheus.NewDesc("nearmargin_active_model_info", "Always 1; the labels say which model is active.", []string{"model", "sha256"}, nil)

// Describe implements prometheus.Collector.
func (a activeModel) Describe(c chan<- *prometheus.Desc) { c <- activeModelDesc }

// Collect implements prometheus.Collector.
func (a activeModel) Collect(c chan<- prometheus.Metric) {
	m := a.models.Active()
	c <- prometheus.MustNewConstMetric(activeModelDesc, prometheus.GaugeValue, 1, m.Ref(), m.SHA256())
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
