// Package access decides who may ask and how often: bearer tokens kept as
// SHA-256 sums, a request rate for each client, origins that browsers may ask
// from, and the proxies that are believed about a client's address.
//
// It knows nothing of routes or answers. Everything here is safe for use by
// several goroutines at once.
package access
