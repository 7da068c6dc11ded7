// Package page holds what a browser is shown: the map page, the reference page
// made from the OpenAPI document, and the files that they load. All of it is part
// of the program, and nothing is asked of another host.
package page
