package api

import (
	"bytes"
	"encoding/json"
	"fmt"
	"net"
	"net/http"
)

// Listener makes the answers that net/http itself gives to requests which never
// reach a handler (a broken request line, a header too long, an unknown transfer
// coding) problem documents as well. net/http writes them straight to the
// connection, as plain text and some with a status of 5xx. headerBytes is the
// server's limit, which is told to who goes beyond.
func Listener(l net.Listener, headerBytes int) net.Listener { return listener{l, headerBytes} }

type listener struct {
	net.Listener
	headerBytes int
}

func (l listener) Accept() (net.Conn, error) {
	c, err := l.Listener.Accept()
	if err != nil {
		return nil, err
	}
	return &faultConn{c, l.headerBytes}, nil
}

// faultConn puts a problem document in place of net/http's own plain text.
type faultConn struct {
	net.Conn
	headerBytes int
}

// The form of net/http's own answers. An answer of a handler never has it: it
// carries a Date, and no handler here answers 417.
var (
	plainFault        = []byte("\r\nContent-Type: text/plain; charset=utf-8\r\nConnection: close\r\n\r\n")
	expectationFailed = []byte("HTTP/1.1 417 ")
	statusLine        = []byte("HTTP/1.1 ")
)

// longestFault is the most bytes that net/http writes of a fault.
const longestFault = 512

func (c *faultConn) Write(p []byte) (int, error) {
	if len(p) > longestFault || !bytes.HasPrefix(p, statusLine) {
		return c.Conn.Write(p)
	}
	var answer []byte
	if head, text, ok := bytes.Cut(p, plainFault); ok && !bytes.Contains(head, []byte("\r\n")) {
		answer = rawAnswer(rawProblem(string(head), string(text), c.headerBytes))
	} else if bytes.HasPrefix(p, expectationFailed) {
		const detail = "the only expectation met is 100-continue"
		answer = rawAnswer(newProblem(http.StatusExpectationFailed, kindExpectation, "The expectation is not met", detail, FieldFault{Parameter: "Expect", Detail: detail}))
	} else {
		return c.Conn.Write(p)
	}
	if _, err := c.Conn.Write(answer); err != nil {
		return 0, err
	}
	return len(p), nil
}

// CloseWrite lets net/http close the sending side alone, so that the client can
// read the answer before the connection is reset.
func (c *faultConn) CloseWrite() error {
	if t, ok := c.Conn.(interface{ CloseWrite() error }); ok {
		return t.CloseWrite()
	}
	return nil
}

// rawProblem returns the problem for a fault that net/http found, of which it
// wrote the status line and a text. The statuses of 5xx that it has for requests
// become 400: the fault is the request's.
func rawProblem(head, text string, headerBytes int) *Problem {
	status := http.StatusBadRequest
	var found int
	if n, _ := fmt.Sscanf(head, "HTTP/1.1 %d", &found); n == 1 && found >= 400 && found < 500 {
		status = found
	}
	switch {
	case status == http.StatusRequestHeaderFieldsTooLarge:
		detail := fmt.Sprintf("the request line and the header are longer together than %d bytes, which is the limit; send less", headerBytes)
		return newProblem(status, kindLongHeader, "The header is too large", detail, FieldFault{Parameter: "header", Detail: detail})
	case found == http.StatusNotImplemented:
		const detail = "the transfer coding is not known here; send Transfer-Encoding: chunked, or a Content-Length"
		return badRequest(FieldFault{Parameter: "Transfer-Encoding", Detail: detail})
	case found == http.StatusHTTPVersionNotSupported:
		const detail = "the version of HTTP is not spoken here; send HTTP/1.1"
		return badRequest(FieldFault{Parameter: "request line", Detail: detail})
	}
	return badRequest(FieldFault{Parameter: "request", Detail: "this is not an HTTP/1.1 request that can be read: " + text})
}

// rawAnswer is a whole answer with a problem document, for a connection that is
// closed after it.
func rawAnswer(p *Problem) []byte {
	body, err := json.Marshal(p)
	if err != nil { // a Problem holds nothing that cannot be encoded
		body = []byte("{}")
	}
	return fmt.Appendf(nil, "HTTP/1.1 %d %s\r\nContent-Type: application/problem+json\r\nX-Content-Type-Options: nosniff\r\nContent-Length: %d\r\nConnection: close\r\n\r\n%s",
		p.Status, http.StatusText(p.Status), len(body), body)
}
