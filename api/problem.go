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

// newProblem returns a problem of a kind, which is the last part of its type.
func newProblem(status int, kind, title, detail string, faults ...FieldFault) *Problem {
	return &Problem{Type: problemType + kind, Title: title, Status: status, Detail: detail, Errors: faults}
}

// badRequest returns the problem for faults of a request's syntax or ranges.
func badRequest(faults ...FieldFault) *Problem {
	detail := faults[0].Detail
	if p := faults[0].Parameter; p != "" {
		detail = p + ": " + detail
	}
	return newProblem(http.StatusBadRequest, "invalid-request", "The request is not valid", detail, faults...)
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
			return newProblem(http.StatusRequestEntityTooLarge, "too-large", "The body is too large", input.Detail, inputFault(input))
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

func statusProblem(status int) *Problem {
	switch status {
	case http.StatusNotFound:
		const detail = "See /openapi.json for the paths there are."
		return newProblem(status, "not-found", "There is nothing at this path", detail, FieldFault{Parameter: "path", Detail: detail})
	case http.StatusMethodNotAllowed:
		const detail = "The Allow header lists the methods it takes."
		return newProblem(status, "method-not-allowed", "The path does not take this method", detail, FieldFault{Parameter: "method", Detail: detail})
	}
	return newProblem(status, "http-"+fmt.Sprint(status), http.StatusText(status), "")
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
