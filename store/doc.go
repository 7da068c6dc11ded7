// Package store keeps editions of models in PostGIS: it imports, lists, activates
// and loads them, and follows which edition is active.
//
// An edition goes in and comes out whole: one transaction in, a checksum compared
// on the way out, the same canonical files as the directory that it came from.
// Nothing that answers a request asks the database: a [Library] loads editions
// into memory and changes them there.
//
// A [Store] is one connection and not safe for concurrent use; a [Library] is.
package store
