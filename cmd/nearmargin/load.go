package main

import (
	"fmt"
	"os"
	"sync/atomic"

	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
)

// builtinName is the name of the model within the program.
const builtinName = "builtin"

// load reads the model of a name: builtin, or a directory.
func load(name string) (*bundle.Bundle, error) {
	if name == builtinName {
		return builtin.Load()
	}
	st, err := os.Stat(name) // #nosec G703 -- the operator's own path
	if err != nil {
		return nil, fmt.Errorf("model %s: %w; name a model directory, or %s", name, err, builtinName)
	}
	if !st.IsDir() {
		return nil, fmt.Errorf("model %s is a file; name a model directory, or %s", name, builtinName)
	}
	b, err := bundle.Read(os.DirFS(name))
	if err != nil {
		return nil, fmt.Errorf("model %s: %w", name, err)
	}
	return b, nil
}

// single is the api.Models of a program that serves one model, which may be changed
// for another in one step.
type single struct{ m atomic.Pointer[setting.Model] }

func (s *single) Active() *setting.Model { return s.m.Load() }

func (s *single) Find(ref string) (*setting.Model, bool) {
	if m := s.m.Load(); ref == m.ID() || ref == m.Ref() {
		return m, true
	}
	return nil, false
}

func (s *single) All() []*setting.Model { return []*setting.Model{s.m.Load()} }
