package api

import (
	"fmt"
	"net/http"

	"github.com/labstack/echo/v4"

	"nearmargin/setting"
)

// lookup returns the look-up that a request's model, motion and motion_fallback
// parameters ask for.
func (s *Server) lookup(c echo.Context, q *query, brief bool) (*setting.Lookup, error) {
	m, err := s.findModel(c, q.text("model"))
	if err != nil {
		return nil, err
	}
	return m.Lookup(setting.Options{Motion: q.text("motion"), Fallback: q.text("motion_fallback"), Brief: brief})
}

// findModel returns the model of a name, the active one where it is "", and notes
// that the request is answered from it.
func (s *Server) findModel(c echo.Context, ref string) (*setting.Model, error) {
	m, ok := s.cfg.Models.Active(), true
	if ref != "" {
		m, ok = s.cfg.Models.Find(ref)
	}
	if !ok {
		detail := fmt.Sprintf("no model %.60q is loaded; /v1/models lists those that are", ref)
		return nil, newProblem(http.StatusNotFound, kindNoModel, "The model is not loaded", detail, FieldFault{Parameter: "model", Detail: detail})
	}
	c.Set(keyModel, m)
	return m, nil
}
