package licences

import (
	_ "embed"
	"strings"
)

//go:embed LICENCES.txt
var list string

// Of returns the SPDX identifier of a module's licence, "" where the list does not
// have the module in that version.
func Of(path, version string) string {
	for line := range strings.Lines(list) {
		if f := strings.Fields(line); len(f) == 4 && f[0] == path && f[1] == version {
			return f[2]
		}
	}
	return ""
}
