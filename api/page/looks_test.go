package page_test

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"github.com/chromedp/chromedp"
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

// TestMapIsLegible computes the contrast of what is drawn on the map in both themes: 3
// for lines and markers against sea and land, with and without the tint of a plate, and
// 4.5 for names against their halo (WCAG 2.2, 1.4.11 and 1.4.3). It proves that types of
// boundaries and labels of one colour differ by pattern and shape.
func TestMapIsLegible(t *testing.T) {
	h := newHost(t)
	for _, dark := range []bool{false, true} {
		b := newTab(t, h, 800, 600, dark, "")
		for _, bad := range eval[[]string](b, `import("/assets/symbols.js").then((m) => {
			const p = m.palette(), bad = [];
			const rgb = (s) => s.length === 7 ? [1, 3, 5].map((i) => parseInt(s.slice(i, i + 2), 16)) : bad.push("no colour: " + s);
			const lum = (c) => { const [r, g, b] = c.map((v) => { v /= 255; return v <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4; }); return 0.2126 * r + 0.7152 * g + 0.0722 * b; };
			const ratio = (a, b) => (Math.max(lum(a), lum(b)) + 0.05) / (Math.min(lum(a), lum(b)) + 0.05);
			const over = (top, base, alpha) => rgb(base).map((v, i) => v * (1 - alpha) + rgb(top)[i] * alpha);
			const grounds = { halo: rgb(p.halo) };
			for (const base of ["sea", "land"]) {
				grounds[base] = rgb(p[base]);
				for (const tint of ["subduction", "ridge", "transform", "convergence", "rift", "mark"]) grounds[base + " tinted " + tint] = over(p[tint], p[base], 0.08);
			}
			const marks = Object.fromEntries(["subduction", "ridge", "transform", "convergence", "rift", "slab", "zone", "hot", "mark", "ink"].map((n) => [n, p[n]]));
			for (const f of ["subduction", "spreading", "rift", "transform", "collision", "convergence", "interior"]) marks["a site of " + f] = m.siteColour(f, p.dark);
			let least = 99;
			for (const [name, colour] of Object.entries(marks)) for (const [on, ground] of Object.entries(grounds)) {
				const r = ratio(rgb(colour), ground);
				least = Math.min(least, r);
				if (r < 3) bad.push(name + " on " + on + ": " + r.toFixed(2));
			}
			for (const name of ["ink", "soft", "slab", "hot"]) if (ratio(rgb(p[name]), grounds.halo) < 4.5) bad.push("names in " + name + ": " + ratio(rgb(p[name]), grounds.halo).toFixed(2));
			const patterns = Object.entries(m.types).map(([n, l]) => [n, JSON.stringify([l.core ? 1 : 0, l.dash || [], l.mark || ""])]);
			for (const [n, a] of patterns) for (const [o, b] of patterns) if (n < o && a === b) bad.push(n + " and " + o + " have one pattern");
			if (patterns.length !== 7 || least === 99) bad.push("nothing was looked at");
			return bad;
		})`) {
			t.Errorf("dark %v: %s", dark, bad)
		}
		b.quiet()
	}
}

// TestEveryStateIsLegible computes the contrast of texts in the states of the page other
// than an answer.
func TestEveryStateIsLegible(t *testing.T) {
	h := newHost(t)
	for _, dark := range []bool{false, true} {
		b := newTab(t, h, 360, 740, dark, "")
		check := func(state string) {
			t.Helper()
			for _, bad := range eval[[]string](b, contrastScript) {
				if !strings.HasPrefix(bad, "only") { // some have few texts
					t.Errorf("%s, dark %v: %s", state, dark, bad)
				}
			}
			if over := eval[float64](b, "document.documentElement.scrollWidth - document.documentElement.clientWidth"); over > 0 {
				t.Errorf("%s: the page is %g px wider than its window", state, over)
			}
			b.shot(fmt.Sprintf("%s-360-%v", state, dark))
		}
		check("start")
		drop(b, "samples.csv", sitesTable(30, "Condor"))
		b.heading("samples.csv")
		check("sites")
		drop(b, "box.json", []byte(`{"type":"Polygon","coordinates":[[[-75,-40],[-65,-40],[-65,-30],[-75,-30],[-75,-40]]]}`))
		b.heading("Area")
		check("area")
		ask(b, "85.3 27.7")
		b.heading("Plate interior")
		check("two-readings")
		h.stop()
		ask(b, "27.7 N 85.3 E")
		b.wait("the page says so", `!document.querySelector("#offline").hidden`)
		check("away")
		h.start()
		b.heading("Collision zone")
	}
}

// TestVelocityHasItsEllipse: with a motion model that gives σ of the azimuth the arrow
// carries an ellipse whose half-axes are σ of the rate and σ across it; without, a bar.
func TestVelocityHasItsEllipse(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	b.run(chromedp.Evaluate(`(() => {
		window.ellipses = [];
		const real = Path2D.prototype.ellipse;
		window.words = [];
		const fill = CanvasRenderingContext2D.prototype.fillText;
		CanvasRenderingContext2D.prototype.fillText = function (t, ...a) { window.words.push(t); return fill.call(this, t, ...a); };
		Path2D.prototype.ellipse = function (...a) { window.ellipses.push(a); return real.apply(this, a); };
	})()`, nil))
	b.run(chromedp.SetValue("#motion", "itrf2014"))
	ask(b, "33.5 S 71.6 W")
	b.heading("Forearc")
	b.wait("an ellipse is drawn", "window.ellipses.length > 0")
	b.shot("ellipse")
	type drawn struct{ Rate, Centre, Along, Across, WantAlong, WantAcross float64 }
	got := eval[drawn](b, `fetch("/v1/point?lon=-71.6&lat=-33.5&motion=itrf2014").then((r) => r.json()).then((a) => {
		const m = a.nearest_boundary.relative_motion, [x, , along, across] = window.ellipses.at(-1), px = x / m.rate_mm_yr;
		const larger = Number(window.words.findLast((w) => w.includes("mm/yr")).match(/σ drawn ×(\d+)/)?.[1] || 1);
		return { Rate: m.rate_mm_yr, Centre: x, Along: along, Across: across, WantAlong: m.rate_sigma_mm_yr * px * larger, WantAcross: m.rate_mm_yr * m.azimuth_sigma_deg * Math.PI / 180 * px * larger };
	})`)
	if got.Rate < 50 || got.Centre < got.Rate || math.Abs(got.Along-got.WantAlong) > 1e-6 || math.Abs(got.Across-got.WantAcross) > 1e-6 || math.Max(got.Along, got.Across) < 2 {
		t.Errorf("the ellipse is %+v", got)
	}
	b.run(chromedp.SetValue("#motion", ""))
	ask(b, "33.5 S 71.6 W")
	b.wait("the other model's answer", `document.querySelector("#panel").textContent.includes("nnr-morvel56")`)
	b.run(chromedp.Sleep(100*time.Millisecond), chromedp.Evaluate("window.ellipses.length = 0", nil), chromedp.Click("#zoom-in"), chromedp.Sleep(100*time.Millisecond))
	if n := eval[int](b, "window.ellipses.length"); n != 0 {
		t.Errorf("%d ellipses without σ of the azimuth", n)
	}
	b.quiet()
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
