package api

import (
	"errors"
	"fmt"
	"net/http"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/annotate"
	"nearmargin/setting"
)

// Problem is an RFC 9457 problem document.
type Problem struct {
	Type   string       `json:"type"`
	Title  string       `json:"title"`
	Status int          `json:"status"`
	Detail string       `json:"detail,omitempty"`
	Errors []FieldFault `json:"errors,omitempty"`

	retryAfter time.Duration // for the header Retry-After, none where 0
}

// FieldFault names one place of a request that is at fault.
type FieldFault struct {
	Parameter string  `json:"parameter,omitempty"`
	Pointer   *string `json:"pointer,omitempty"` // JSON pointer; "" is the whole body
	Line      int     `json:"line,omitempty"`
	Column    int     `json:"column,omitempty"`
	Detail    string  `json:"detail"`
}

func (p *Problem) Error() string { return fmt.Sprintf("%d %s: %s", p.Status, p.Title, p.Detail) }

const problemType = "urn:nearmargin:problem:"

// problemKind is the last part of a problem's type.
type problemKind string

// The kinds of problems, each described in openapi.json by an example.
const (
	kindInvalid     problemKind = "invalid-request"
	kindToken       problemKind = "token"
	kindScope       problemKind = "scope"
	kindNotFound    problemKind = "not-found"
	kindNoModel     problemKind = "no-such-model"
	kindMethod      problemKind = "method-not-allowed"
	kindSlow        problemKind = "too-slow"
	kindLarge       problemKind = "too-large"
	kindMedia       problemKind = "unsupported-media-type"
	kindExpectation problemKind = "expectation-failed"
	kindImpossible  problemKind = "impossible-geometry"
	kindNoSlab      problemKind = "no-slab"
	kindRate        problemKind = "too-many-requests"
	kindLongHeader  problemKind = "header-too-large"
	kindInternal    problemKind = "http-500"
	kindManyBatches problemKind = "too-many-batches"
	kindManyAreas   problemKind = "too-many-areas"
	kindDraining    problemKind = "draining"
)

// newProblem returns a problem of a kind.
func newProblem(status int, kind problemKind, title, detail string, faults ...FieldFault) *Problem {
	return &Problem{Type: problemType + string(kind), Title: title, Status: status, Detail: detail, Errors: faults}
}

// badRequest returns the problem for faults of a request's syntax or ranges.
func badRequest(faults ...FieldFault) *Problem {
	detail := faults[0].Detail
	if p := faults[0].Parameter; p != "" {
		detail = p + ": " + detail
	}
	return newProblem(http.StatusBadRequest, kindInvalid, "The request is not valid", detail, faults...)
}

// problemOf turns any error into a problem document. The cause of an internal
// error is for the log alone.
func problemOf(err error) *Problem {
	var problem *Problem
	var field *setting.FieldError
	var input *annotate.InputError
	var httpError *echo.HTTPError
	var binding *echo.BindingError
	switch {
	case errors.As(err, &problem):
		return problem
	case errors.As(err, &field):
		return badRequest(FieldFault{Parameter: field.Field, Detail: field.Detail})
	case errors.As(err, &input):
		if input.TooLarge {
			return newProblem(http.StatusRequestEntityTooLarge, kindLarge, "The body is too large", input.Detail, inputFault(input))
		}
		return badRequest(inputFault(input))
	case errors.As(err, &binding):
		return badRequest(FieldFault{Parameter: binding.Field, Detail: fmt.Sprint(binding.Message)})
	case errors.As(err, &httpError):
		return statusProblem(httpError.Code)
	}
	return statusProblem(http.StatusInternalServerError)
}

func inputFault(e *annotate.InputError) FieldFault {
	f := FieldFault{Parameter: e.Parameter, Line: e.Line, Detail: e.Detail}
	if e.Pointer != "" || e.Parameter == "" && e.Line == 0 {
		f.Pointer = &e.Pointer
	}
	return f
}

// statusProblem returns the problem for a status that the router found; any but its
// two is a fault of the service.
func statusProblem(status int) *Problem {
	switch status {
	case http.StatusNotFound:
		const detail = "See /openapi.json for the paths there are."
		return newProblem(status, kindNotFound, "There is nothing at this path", detail, FieldFault{Parameter: "path", Detail: detail})
	case http.StatusMethodNotAllowed:
		const detail = "The Allow header lists the methods it takes."
		return newProblem(status, kindMethod, "The path does not take this method", detail, FieldFault{Parameter: "method", Detail: detail})
	}
	return newProblem(http.StatusInternalServerError, kindInternal, http.StatusText(http.StatusInternalServerError), "")
}

// writeProblem sends the problem document for an error.
func writeProblem(c echo.Context, p *Problem) error {
	c.Response().Header().Set(echo.HeaderContentType, "application/problem+json")
	c.Response().Header().Set("X-Content-Type-Options", "nosniff")
	if c.Request().Method == http.MethodHead {
		return c.NoContent(p.Status)
	}
	c.Response().WriteHeader(p.Status)
	return encodeJSON(c.Response(), p)
}
