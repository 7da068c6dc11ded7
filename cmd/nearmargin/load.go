package main

import (
	"fmt"
	"os"

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
	st, err := os.Stat(name)
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

// one is the api.Models of a program that serves a single model.
type one struct{ m *setting.Model }

func (o one) Active() *setting.Model { return o.m }

func (o one) Find(ref string) (*setting.Model, bool) {
	if ref == o.m.ID() || ref == o.m.Ref() {
		return o.m, true
	}
	return nil, false
}

func (o one) All() []*setting.Model { return []*setting.Model{o.m} }
