// Package licences holds the list of the modules that the program and its tests
// are made of, with their licences, and the test that keeps it true.
package licences
