package main

import (
	"context"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"time"
)

// healthTime bounds a health check.
const healthTime = 5 * time.Second

// health asks a service whether it is well, for images without a shell.
func health(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(1, 1); err != nil {
		return err
	}
	u, err := url.Parse(f.args[0])
	if err != nil || u.Scheme != "http" && u.Scheme != "https" || u.Host == "" {
		return usageError("%.80q is no URL of a service; want such as http://127.0.0.1:8080/readyz", f.args[0])
	}
	ctx, cancel := context.WithTimeout(ctx, healthTime)
	defer cancel()
	req, err := http.NewRequestWithContext(ctx, http.MethodGet, u.String(), nil) // #nosec G704 -- asks the address that the operator typed
	if err != nil {
		return err
	}
	res, err := http.DefaultClient.Do(req) // #nosec G704 -- asks the address that the operator typed
	if err != nil {
		return err
	}
	defer res.Body.Close()
	body, err := io.ReadAll(io.LimitReader(res.Body, 4<<10))
	if err != nil {
		return err
	}
	if res.StatusCode != http.StatusOK {
		return fmt.Errorf("%s answers %s: %s", u.Redacted(), res.Status, body)
	}
	_, err = p.stdout.Write(body)
	return err
}
