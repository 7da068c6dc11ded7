package page_test

import (
	"fmt"
	"testing"
)

// TestSizesAndThemes opens the page with an answer in three sizes and both themes:
// nothing overflows sideways, every text has the contrast of WCAG 2.2 level AA, and
// the console stays silent.
func TestSizesAndThemes(t *testing.T) {
	h := newHost(t)
	const answer = "#site=-71.6,-33.5&view=-71,-33,6&layers=plates,boundaries,slabs,zones,hotspots"
	for _, size := range [][2]int{{360, 740}, {1280, 800}, {3840, 2160}} {
		for _, dark := range []bool{false, true} {
			theme := map[bool]string{false: "light", true: "dark"}[dark]
			t.Run(fmt.Sprintf("%d-%s", size[0], theme), func(t *testing.T) {
				b := newTab(t, h, size[0], size[1], dark, answer)
				b.heading("Forearc")
				b.shot(fmt.Sprintf("answer-%d-%s", size[0], theme))
				if over := eval[float64](b, "document.documentElement.scrollWidth - document.documentElement.clientWidth"); over > 0 {
					t.Errorf("the page is %g px wider than its window", over)
				}
				for _, bad := range eval[[]string](b, contrastScript) {
					t.Error(bad)
				}
				t.Logf("the first answer came %.0f ms after the page was asked for", eval[float64](b, `performance.getEntriesByType("resource").find((e) => e.name.includes("/v1/point")).responseEnd`))
				b.quiet()
			})
		}
	}
}

// contrastScript lists the texts whose contrast with their background is below 4.5,
// by the formula of WCAG 2.2 (relative luminance).
const contrastScript = `(() => {
  const rgb = (s) => (s.match(/[\d.]+/g) || []).map(Number);
  const lum = (c) => { const [r, g, b] = c.map((v) => { v /= 255; return v <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4; }); return 0.2126 * r + 0.7152 * g + 0.0722 * b; };
  const back = (e) => { for (; e; e = e.parentElement) { const c = rgb(getComputedStyle(e).backgroundColor); if (c.length === 3 || c[3] > 0.9) return c.slice(0, 3); } return [255, 255, 255]; };
  const bad = [];
  const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  let seen = 0;
  while (walk.nextNode()) {
    const e = walk.currentNode.parentElement;
    if (!walk.currentNode.data.trim() || !e.checkVisibility() || e.closest("noscript, script, .away")) continue;
    seen++;
    const a = lum(rgb(getComputedStyle(e).color).slice(0, 3)), b = lum(back(e));
    const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    if (ratio < 4.5) bad.push("contrast " + ratio.toFixed(2) + ": " + walk.currentNode.data.trim().slice(0, 40));
  }
  if (seen < 40) bad.push("only " + seen + " texts seen");
  return bad;
})()`
