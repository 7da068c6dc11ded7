// Package builtin holds the model that nearmargin carries within itself: its
// files, and nothing else. They take about 0.4 MB of the program.
package builtin

import (
	"embed"
	"io/fs"

	"nearmargin/setting/bundle"
)

//go:embed model
var files embed.FS

// Files returns the built-in model directory.
func Files() fs.FS {
	sub, err := fs.Sub(files, "model")
	if err != nil {
		panic(err) // the name is a constant and valid
	}
	return sub
}

// Load reads the built-in model.
func Load() (*bundle.Bundle, error) { return bundle.Read(Files()) }
