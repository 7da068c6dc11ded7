package api

import (
	"net/http"
	"strconv"
	"strings"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/promhttp"
)

// Why a request was refused before any work was done on it.
const (
	refusedRate  = string(kindRate)
	refusedBatch = string(kindManyBatches)
	refusedArea  = string(kindManyAreas)
	refusedToken = string(kindToken)
	refusedScope = string(kindScope)
)

var refusals = []string{refusedRate, refusedBatch, refusedArea, refusedToken, refusedScope}

// operations makes the counters of what operations look after. Every series is
// there from the start, so that a rate over it is defined.
func (m *metrics) operations() {
	m.cut = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "nearmargin_batches_cut_total", Help: "Batches that ended before their end, by reason.",
	}, []string{"reason"})
	m.refused = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "nearmargin_requests_refused_total", Help: "Requests refused before any work: no room for a batch or an area, too many requests, no token, a token of another scope.",
	}, []string{"reason"})
	m.panics = prometheus.NewCounter(prometheus.CounterOpts{
		Name: "nearmargin_panics_total", Help: "Panics of handlers; each is a defect.",
	})
	for _, r := range cutReasons {
		m.cut.WithLabelValues(r)
	}
	for _, r := range refusals {
		m.refused.WithLabelValues(r)
	}
}

// watch registers what is read when the metrics are asked for.
func (m *metrics) watch(reg *prometheus.Registry, g *gate, models Models) {
	reg.MustRegister(
		prometheus.NewGaugeFunc(prometheus.GaugeOpts{
			Name: "nearmargin_batches_running", Help: "Batches that run at this moment.",
		}, func() float64 { return float64(g.running()) }),
		prometheus.NewGaugeFunc(prometheus.GaugeOpts{
			Name: "nearmargin_batches_limit", Help: "Batches that may run at once.",
		}, func() float64 { return float64(cap(g.slots)) }),
		prometheus.NewGaugeFunc(prometheus.GaugeOpts{
			Name: "nearmargin_draining", Help: "1 while the service shuts down and takes no new batches, else 0.",
		}, func() float64 {
			if g.draining.Load() {
				return 1
			}
			return 0
		}),
		&modelCollector{models: models,
			info:  prometheus.NewDesc("nearmargin_model_info", "Always 1; the labels name an edition that is loaded, its checksum and whether it is the active one.", []string{"id", "edition", "sha256", "active"}, nil),
			dated: prometheus.NewDesc("nearmargin_model_edition_timestamp_seconds", "First day of the month that an edition's name begins with (YYYY.MM), as Unix time.", []string{"id", "edition"}, nil),
		})
}

// modelCollector tells at each scrape what is loaded then.
type modelCollector struct {
	models      Models
	info, dated *prometheus.Desc
}

func (c *modelCollector) Describe(ch chan<- *prometheus.Desc) { ch <- c.info; ch <- c.dated }

func (c *modelCollector) Collect(ch chan<- prometheus.Metric) {
	active := c.models.Active()
	for _, m := range c.models.All() {
		ch <- prometheus.MustNewConstMetric(c.info, prometheus.GaugeValue, 1, m.ID(), m.Edition(), m.SHA256(), strconv.FormatBool(m == active))
		if t, ok := editionMonth(m.Edition()); ok {
			ch <- prometheus.MustNewConstMetric(c.dated, prometheus.GaugeValue, float64(t.Unix()), m.ID(), m.Edition())
		}
	}
}

// editionMonth returns the month that an edition's name begins with, as in
// 2026.12.2; false where it does not.
func editionMonth(edition string) (time.Time, bool) {
	parts := strings.SplitN(edition, ".", 3)
	if len(parts) < 2 {
		return time.Time{}, false
	}
	t, err := time.Parse("2006.1", parts[0]+"."+strings.TrimPrefix(parts[1], "0"))
	return t, err == nil
}

// Metrics serves the metrics, for a port of their own.
func (s *Server) Metrics() http.Handler {
	return promhttp.HandlerFor(s.cfg.Registry, promhttp.HandlerOpts{})
}
