// Package migrations holds the numbered SQL that builds the schema nearmargin.
// Each file tells at its top why it is there. Files that have been released are
// never changed: a change is a new number.
package migrations

import "embed"

// FS holds the migrations.
//
//go:embed *.sql
var FS embed.FS
