package page_test

import (
	"testing"

	"github.com/chromedp/chromedp"
)

// TestLinkWithoutAView: given a link that names a site and nothing else, expect the map
// to show it.
func TestLinkWithoutAView(t *testing.T) {
	b := newTab(t, newHost(t), 360, 740, false, "#site=142.3,39.1")
	b.heading("Forearc")
	b.run(chromedp.Click("#zoom-in", chromedp.ByQuery))
	b.wait("the view is around the site", `location.hash.includes("view=142.30,39.10,")`)
	b.quiet()
}
