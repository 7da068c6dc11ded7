package page_test

import (
	"fmt"
	"testing"

	"github.com/chromedp/chromedp"
)

// TestReferenceSizesAndThemes opens the reference page in two sizes and both themes: it
// is not wider than its window, every text has the contrast of WCAG 2.2 level AA,
// headings go down one level at a time, what scrolls can be reached with the keyboard,
// and the console stays silent.
func TestReferenceSizesAndThemes(t *testing.T) {
	h := newHost(t)
	for _, size := range [][2]int{{360, 740}, {1280, 800}} {
		for _, dark := range []bool{false, true} {
			theme := map[bool]string{false: "light", true: "dark"}[dark]
			t.Run(fmt.Sprintf("%d-%s", size[0], theme), func(t *testing.T) {
				b := newTab(t, h, size[0], size[1], dark, referencePage)
				b.shot(fmt.Sprintf("reference-%d-%s", size[0], theme))
				for _, place := range []string{"point", "annotate", "headers", "problem-no-slab", "schema-Answer"} {
					b.run(chromedp.Evaluate(fmt.Sprintf("location.hash = %q", place), nil))
					b.shot(fmt.Sprintf("reference-%d-%s-%s", size[0], theme, place))
				}
				b.run(chromedp.Evaluate(`document.querySelectorAll("details").forEach((d) => { d.open = true; })`, nil))
				if over := eval[float64](b, "document.documentElement.scrollWidth - document.documentElement.clientWidth"); over > 0 {
					t.Errorf("the page is %g px wider than its window", over)
				}
				for _, bad := range eval[[]string](b, contrastScript) {
					t.Error(bad)
				}
				for _, bad := range eval[[]string](b, structureScript) {
					t.Error(bad)
				}
				b.quiet()
			})
		}
	}
}

// structureScript lists headings that skip a level, ids given twice, things that scroll
// and cannot be focused, and regions without a name.
const structureScript = `(() => {
  const bad = [];
  let level = 1;
  for (const h of document.querySelectorAll("h1, h2, h3, h4")) {
    const l = Number(h.tagName[1]);
    if (l > level + 1) bad.push("after level " + level + " comes " + h.tagName + " " + h.textContent);
    level = l;
  }
  const ids = new Set();
  for (const e of document.querySelectorAll("[id]")) {
    if (ids.has(e.id)) bad.push("the id " + e.id + " is given twice");
    ids.add(e.id);
  }
  for (const e of document.querySelectorAll("main *")) {
    if (e.scrollWidth > e.clientWidth + 1 && ["auto", "scroll"].includes(getComputedStyle(e).overflowX) && e.tabIndex < 0) bad.push(e.tagName + " scrolls and cannot be focused: " + e.textContent.slice(0, 40));
    if (e.getAttribute("role") === "region" && !e.getAttribute("aria-label")) bad.push("a region without a name");
  }
  return bad;
})()`
