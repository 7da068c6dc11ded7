package access

import "sync/atomic"

// Ring holds the tokens that are valid at this moment. They are changed for others
// as a whole, so that a request sees either the old or the new. A nil Ring has none.
type Ring struct{ tokens atomic.Pointer[Tokens] }

// NewRing returns a ring that holds t.
func NewRing(t *Tokens) *Ring {
	r := &Ring{}
	r.Replace(t)
	return r
}

// Tokens returns the tokens that are valid now.
func (r *Ring) Tokens() *Tokens {
	if r == nil {
		return nil
	}
	return r.tokens.Load()
}

// Replace makes t the tokens that are valid from now on.
func (r *Ring) Replace(t *Tokens) { r.tokens.Store(t) }
