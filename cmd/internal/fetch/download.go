package fetch

import (
	"context"
	"fmt"
	"net/http"
	"net/url"
)

const maxRedirects = 10

// download fetches an address into a file.
func (f *Fetcher) download(ctx context.Context, address string) (string, error) {
	u, err := url.Parse(address)
	if err != nil {
		return "", err
	}
	timeout := f.Timeout
	if timeout <= 0 {
		timeout = DefaultTimeout
	}
	ctx, cancel := context.WithTimeout(ctx, timeout)
	defer cancel()
	req, err := http.NewRequestWithContext(ctx, http.MethodGet, address, nil)
	if err != nil {
		return "", err
	}
	// as it is published: a server must not pack it for the journey, or the
	// checksum would be another's
	req.Header.Set("Accept-Encoding", "identity")
	resp, err := f.client().Do(req)
	if err != nil {
		return "", err
	}
	defer resp.Body.Close()
	if resp.StatusCode != http.StatusOK {
		return "", fmt.Errorf("the server answered %s", resp.Status)
	}
	if resp.ContentLength > f.maxBytes() {
		return "", fmt.Errorf("has %d bytes, more than the %d allowed", resp.ContentLength, f.maxBytes())
	}
	where, _, err := f.save(u.Path, resp.Body, f.maxBytes())
	return where, err
}

// client returns the client, made to follow a bounded number of redirects and
// none from https to http.
func (f *Fetcher) client() *http.Client {
	c := http.Client{}
	if f.Client != nil {
		c = *f.Client
	}
	c.CheckRedirect = func(req *http.Request, via []*http.Request) error {
		switch {
		case len(via) >= maxRedirects:
			return fmt.Errorf("more than %d redirects", maxRedirects)
		case via[len(via)-1].URL.Scheme == "https" && req.URL.Scheme != "https":
			return fmt.Errorf("redirected from https to %s", req.URL.Scheme)
		}
		return nil
	}
	return &c
}
