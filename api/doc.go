// Package api is nearmargin's HTTP door: routes, strict decoding, problem
// documents, metrics. A handler decodes, makes one call into the domain, and
// encodes.
//
// Every fault of a request is an RFC 9457 problem document whose errors name the
// parameter, pointer or line at fault, what was wrong and what would be right.
package api
