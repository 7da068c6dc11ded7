package page_test

import (
	"crypto/sha256"
	"encoding/hex"
	"strings"
	"testing"

	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/chromedp"

	"nearmargin/api"
	"nearmargin/api/access"
)

// withTokens lets holders of "may-ask" ask, and those of "may-all" send tables too.
func withTokens(t *testing.T) func(*api.Config) {
	sum := func(token string) string {
		s := sha256.Sum256([]byte(token))
		return hex.EncodeToString(s[:])
	}
	list, err := access.ParseTokens("reader query " + sum("may-ask") + "\nwriter query,batch " + sum("may-all"))
	if err != nil {
		t.Fatal(err)
	}
	return func(c *api.Config) { c.Access.Tokens = access.NewRing(list) }
}

// TestTokens: where the service wants a token the page loads, asks for one, goes on with
// what was wanted, and never shows it or puts it into an address.
func TestTokens(t *testing.T) {
	h := newHost(t, withTokens(t))
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5&layers=plates,boundaries,slabs")
	var asked []string
	chromedp.ListenTarget(b.ctx, func(ev any) {
		if e, ok := ev.(*network.EventRequestWillBeSent); ok {
			b.mu.Lock()
			asked = append(asked, e.Request.URL)
			b.mu.Unlock()
		}
	})
	b.run(network.Enable())
	b.wait("the token is asked for", `document.querySelector("#access").checkVisibility() && document.querySelector("#access-why").textContent.includes("holders of a token")`)
	if got := eval[string](b, `document.activeElement.id`); got != "token" {
		t.Errorf("the focus is on %q", got)
	}
	for _, bad := range eval[[]string](b, contrastScript) {
		if !strings.HasPrefix(bad, "only") { // fewer texts than with an answer
			t.Error(bad)
		}
	}
	controls(b)
	b.shot("token")
	give := func(token string) {
		b.run(chromedp.SetValue("#token", token), chromedp.Click("#access button[type=submit]"))
	}
	give("two words")
	b.wait("a text that is no token", `document.querySelector("#access-why").textContent.includes("no blanks")`)
	give("wrong")
	b.wait("an unknown token", `document.querySelector("#access-why").textContent.includes("not known to the service")`)
	if got := eval[string](b, `JSON.stringify(sessionStorage)`); strings.Contains(got, "wrong") {
		t.Errorf("a token that opens nothing is kept: %s", got)
	}

	give("may-ask")
	b.heading("Forearc") // what was asked for at the start
	b.wait("the form is gone", `!document.querySelector("#access").checkVisibility()`)
	b.wait("the section, which needs the token too", sectionShown)
	b.wait("the layers", `document.querySelectorAll("#motion option").length > 1`)
	if got := textOf(b, "#panel pre"); !strings.Contains(got, `curl -s -H "Authorization: Bearer $NEARMARGIN_TOKEN" 'http`) {
		t.Errorf("the command is %q", got)
	}
	b.run(chromedp.Reload())
	b.heading("Forearc") // the tab keeps the token

	drop(b, "two.csv", []byte("name,lon,lat\na,1,2\nb,-71.6,-33.5\n"))
	b.wait("a token without the scope", `document.querySelector("#access").checkVisibility() && document.querySelector("#access-why").textContent.includes("lacks the scope batch")`)
	b.heading("Forearc")
	give("may-all")
	b.heading("two.csv")

	b.run(chromedp.Click("#token-change"), chromedp.Click("#token-forget"))
	b.wait("the token is forgotten", `document.querySelector("#token-change").hidden && sessionStorage.length === 0`)
	ask(b, "27.7 N 85.3 E")
	b.wait("it is asked for again", `document.querySelector("#access-why").textContent.includes("holders of a token")`)
	give("may-ask")
	b.heading("Collision zone")

	for _, where := range []string{"location.href", "document.documentElement.innerHTML", "JSON.stringify(history.state)", "JSON.stringify(localStorage) + document.cookie"} {
		if got := eval[string](b, where); strings.Contains(got, "may-a") {
			t.Errorf("the token stands in %s", where)
		}
	}
	b.mu.Lock()
	for _, u := range asked {
		if strings.Contains(u, "may-a") {
			t.Errorf("the token stands in the address %s", u)
		}
	}
	if len(asked) < 10 {
		t.Errorf("%d requests were seen", len(asked))
	}
	b.mu.Unlock()
	b.quiet("status of 401", "status of 403")
}
