package api

import (
	"fmt"
	"net/http"

	"nearmargin/setting"
)

// lookup returns the look-up that a request's model, motion and motion_fallback
// parameters ask for.
func (s *Server) lookup(q *query, brief bool) (*setting.Lookup, error) {
	m, err := s.findModel(q.text("model"))
	if err != nil {
		return nil, err
	}
	return m.Lookup(setting.Options{Motion: q.text("motion"), Fallback: q.text("motion_fallback"), Brief: brief})
}

func (s *Server) findModel(ref string) (*setting.Model, error) {
	if ref == "" {
		return s.cfg.Models.Active(), nil
	}
	m, ok := s.cfg.Models.Find(ref)
	if !ok {
		detail := fmt.Sprintf("no model %.60q is loaded; /v1/models lists those that are", ref)
		return nil, newProblem(http.StatusNotFound, kindNoModel, "The model is not loaded", detail, FieldFault{Parameter: "model", Detail: detail})
	}
	return m, nil
}
