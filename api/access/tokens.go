package access

import (
	"crypto/sha256"
	"crypto/subtle"
	"encoding/hex"
	"fmt"
	"regexp"
	"strings"
)

// Scope is what a token allows.
type Scope string

// The scopes.
const (
	Query Scope = "query" // points, areas, sections, boundaries, plates, models
	Batch Scope = "batch" // annotate
)

// AllScopes lists the scopes.
var AllScopes = []Scope{Query, Batch}

// Grant is what a token that was recognised allows.
type Grant struct {
	Name   string // of the token's holder, for the log
	scopes map[Scope]bool
}

// Allows reports whether the grant covers a scope.
func (g Grant) Allows(s Scope) bool { return g.scopes[s] }

// Tokens is a set of tokens of which only the SHA-256 sums are known. Tokens are
// random and long, so that a plain sum is enough: there is nothing to guess.
type Tokens struct {
	sums   [][sha256.Size]byte
	grants []Grant
}

var nameForm = regexp.MustCompile(`^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$`)

// ParseTokens reads one token a line (or between semicolons): a name, scopes
// between commas, and the hexadecimal SHA-256 sum of the token, as in
//
//	field-app query,batch 9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08
//
// Blank lines and lines that start with # are passed over. A name may stand
// several times, so that a new token can be given out before the old one goes.
// An error names the line and never repeats what stands in it.
func ParseTokens(text string) (*Tokens, error) {
	t := &Tokens{}
	line := 0
	for row := range strings.SplitSeq(text, "\n") {
		line++
		if strings.HasPrefix(strings.TrimSpace(row), "#") {
			continue
		}
		for entry := range strings.SplitSeq(row, ";") {
			if strings.TrimSpace(entry) == "" {
				continue
			}
			if err := t.add(strings.Fields(entry)); err != nil {
				return nil, fmt.Errorf("tokens: line %d: %w", line, err)
			}
		}
	}
	return t, nil
}

func (t *Tokens) add(fields []string) error {
	if len(fields) != 3 {
		return fmt.Errorf("%d fields; want three: a name, scopes such as query,batch, and the SHA-256 sum of the token", len(fields))
	}
	if !nameForm.MatchString(fields[0]) {
		return fmt.Errorf("the name must be 1 to 64 letters, digits, '.', '_' or '-'")
	}
	g := Grant{Name: fields[0], scopes: map[Scope]bool{}}
	for s := range strings.SplitSeq(fields[1], ",") {
		switch Scope(s) {
		case Query, Batch:
			g.scopes[Scope(s)] = true
		default:
			return fmt.Errorf("%s has an unknown scope; want query, batch or query,batch", g.Name)
		}
	}
	raw, err := hex.DecodeString(fields[2])
	if err != nil || len(raw) != sha256.Size {
		return fmt.Errorf("the sum of %s is not 64 hexadecimal digits; give the SHA-256 sum of the token, not the token", g.Name)
	}
	sum := [sha256.Size]byte(raw)
	for _, other := range t.sums {
		if other == sum {
			return fmt.Errorf("the sum of %s stands twice", g.Name)
		}
	}
	t.sums = append(t.sums, sum)
	t.grants = append(t.grants, g)
	return nil
}

// Len is the number of tokens.
func (t *Tokens) Len() int {
	if t == nil {
		return 0
	}
	return len(t.sums)
}

// Find returns what a token allows. It compares with every sum, whichever fits,
// so that the time it takes tells nothing.
func (t *Tokens) Find(token string) (Grant, bool) {
	sum := sha256.Sum256([]byte(token))
	found := -1
	for i := range t.sums {
		found = subtle.ConstantTimeSelect(subtle.ConstantTimeCompare(sum[:], t.sums[i][:]), i, found)
	}
	if found < 0 {
		return Grant{}, false
	}
	return t.grants[found], true
}
