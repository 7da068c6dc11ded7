package page_test

import (
	"context"
	"encoding/base64"
	"fmt"
	"net/http"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync/atomic"
	"testing"

	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"
)

// TestAsAPersonWould goes through the page with the mouse: load, click, paste, a
// dropped table, a drawn area, a link, back.
func TestAsAPersonWould(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	b.heading("In what tectonic setting does a place lie?")
	if n := eval[int](b, "document.querySelectorAll('#key li').length"); n != 7+6 {
		t.Errorf("the legend explains %d signs, want 7 types and 6 others", n)
	}
	b.shot("start")

	// the middle of the globe at the start is 30° W 15° N, within the Nubia plate
	b.run(chromedp.MouseClickXY(415, 436))
	b.heading("Plate interior")
	if got := textOf(b, "#panel .lead"); !strings.Contains(got, "Nubia plate") {
		t.Errorf("clicked on the Nubia plate; the answer says %q", got)
	}

	ask(b, "33.5 S 71.6 W")
	b.heading("Forearc")
	for _, want := range []string{"Chile Trench", "±", "mm/yr", "Reasons", "Cautions", "curl -s", "lon=-71.6&lat=-33.5", "sha256"} {
		if !strings.Contains(textOf(b, "#panel"), want) {
			t.Errorf("the answer lacks %q", want)
		}
	}
	b.wait("the section's figure", sectionShown)

	// the link holds what is seen
	link := eval[string](b, "location.hash")
	if !strings.Contains(link, "site=-71.6,-33.5") {
		t.Errorf("the link is %q", link)
	}
	b.run(chromedp.Reload())
	b.wait("the page is ready again", `document.documentElement.dataset.ready === "yes"`)
	b.heading("Forearc")

	ask(b, "85.3 27.7")
	b.wait("latitude first is said", `document.querySelector("#read").textContent.includes("latitude first")`)
	b.run(chromedp.Click("#read button"))
	b.heading("Collision zone")
	b.run(chromedp.Evaluate("history.back()", nil))
	b.wait("the way back", `document.querySelector("#panel .place").textContent.startsWith("85.3000° N")`)

	ask(b, "somewhere")
	if got := textOf(b, "#read"); !strings.Contains(got, "Not understood") {
		t.Errorf("a text without numbers gives %q", got)
	}
	b.quiet()
}

// sectionShown is true where the slab section's figure has been drawn.
const sectionShown = `document.querySelector("#panel figure [role=img]")?.shadowRoot?.querySelector("svg")?.getBoundingClientRect().height > 200 && document.querySelector("#panel a[download]").href.startsWith("blob:")`

// TestDrawnArea draws a triangle with the mouse over the Andes.
func TestDrawnArea(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#view=-70,-30,4")
	b.run(chromedp.Click("#draw"), chromedp.MouseClickXY(380, 350), chromedp.MouseClickXY(480, 350))
	if !eval[bool](b, `document.querySelector("#finish").hidden`) {
		t.Error("two corners can be finished")
	}
	b.run(chromedp.MouseClickXY(430, 500), chromedp.Click("#finish"))
	b.heading("Area")
	if got := textOf(b, "#panel"); !strings.Contains(got, "South America (") || !strings.Contains(got, "km²") {
		t.Errorf("the answer is %.300q", got)
	}
	link := eval[string](b, "location.hash")
	b.run(chromedp.Navigate("about:blank"), chromedp.Navigate(b.url+"/"+link))
	b.heading("Area")
	b.quiet()
}

// TestPanAndZoom drags the map and turns the wheel: the link follows.
func TestPanAndZoom(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#view=0,0,2")
	b.run(chromedp.Evaluate(`(() => {
		const c = document.querySelector("#globe"), at = (type, x, y) => c.dispatchEvent(new PointerEvent(type, {pointerId: 1, clientX: x, clientY: y, button: 0, bubbles: true}));
		c.setPointerCapture = () => {};
		at("pointerdown", 400, 400); at("pointermove", 300, 400); at("pointerup", 300, 400);
	})()`, nil))
	b.wait("the drag is in the link", `/view=([\d.]+),0\.00,2/.test(location.hash) && Number(location.hash.match(/view=([\d.]+)/)[1]) > 5`)
	if textOf(b, "#panel h2") != "In what tectonic setting does a place lie?" {
		t.Error("a drag asked for an answer")
	}
	b.run(chromedp.Evaluate(`document.querySelector("#globe").dispatchEvent(new WheelEvent("wheel", {deltaY: -400, clientX: 420, clientY: 430, cancelable: true}))`, nil))
	b.wait("the zoom is in the link", `Number(location.hash.match(/view=[^,]+,[^,]+,([\d.]+)/)[1]) > 3`)
	b.quiet()
}

// TestWithoutJavaScript: the page says what it is and where to go.
func TestWithoutJavaScript(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 800, 600, false, noScript)
	var text string
	b.run(chromedp.Text("#panel", &text, chromedp.ByQuery))
	for _, want := range []string{"In what tectonic setting", "needs JavaScript", "/v1/point?lon=", "API reference"} {
		if !strings.Contains(text, want) {
			t.Errorf("without JavaScript the page lacks %q; it says %q", want, text)
		}
	}
	b.shot("no-script")
}

// ask types coordinates and sends them.
func ask(b *tab, text string) {
	b.t.Helper()
	b.run(chromedp.SetValue("#where", text), chromedp.Click("#search button"))
}

// drop drops a file on the map.
func drop(b *tab, name string, body []byte) {
	b.t.Helper()
	b.run(chromedp.Evaluate(fmt.Sprintf(`(() => {
		const bytes = Uint8Array.from(atob(%q), (c) => c.charCodeAt(0));
		const d = new DataTransfer();
		d.items.add(new File([bytes], %q));
		for (const type of ["dragenter", "dragover", "drop"]) document.querySelector("#globe").dispatchEvent(new DragEvent(type, {dataTransfer: d, bubbles: true, cancelable: true}));
	})()`, base64.StdEncoding.EncodeToString(body), name), nil))
}

// TestDroppedFiles drops a table, a GeoJSON file, a polygon, and files that are not
// right.
func TestDroppedFiles(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	table, err := os.ReadFile(filepath.Join("..", "..", "testdata", "demo", "sites.csv"))
	if err != nil {
		t.Fatal(err)
	}
	drop(b, "sites.csv", table)
	b.heading("sites.csv")
	if got := textOf(b, "#panel .lead"); !strings.Contains(got, "40 sites have an answer, 1 row has none") {
		t.Errorf("the table of 41 rows, one without a position, gives %q", got)
	}
	if n := eval[int](b, "document.querySelectorAll('.sites button').length"); n != 40 {
		t.Errorf("%d sites are listed, want 40", n)
	}
	b.shot("sites")
	b.run(chromedp.Click(".sites li:nth-child(4) button"))
	b.heading("Forearc") // Osprey Mapocho-4, Chilean coastal range

	drop(b, "one.geojson", []byte(`{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":"Gorkha"},"geometry":{"type":"Point","coordinates":[85.3,27.7]}},{"type":"Feature","properties":null,"geometry":null}]}`))
	b.heading("one.geojson")
	if got := textOf(b, ".sites"); !strings.Contains(got, "Gorkha: collision zone") {
		t.Errorf("the list says %q", got)
	}

	drop(b, "box.json", []byte(`{"type":"Polygon","coordinates":[[[-75,-40],[-65,-40],[-65,-30],[-75,-30],[-75,-40]]]}`))
	b.heading("Area")
	if got := textOf(b, "#panel"); !strings.Contains(got, "Chile Trench") || !strings.Contains(got, "/v1/area") {
		t.Errorf("the area's answer is %.300q", got)
	}
	b.shot("area")

	drop(b, "columns.csv", []byte("name,x,y\nGorkha,85.3,27.7\n"))
	b.wait("the columns are asked for", `document.querySelector("#lon-column")`)
	b.run(chromedp.SendKeys("#lon-column", "x"), chromedp.SendKeys("#lat-column", "y"), chromedp.Click("#panel form button"))
	b.heading("columns.csv")

	drop(b, "broken.geojson", []byte(`{"type":`))
	b.wait("the fault is said", `document.querySelector("#panel").textContent.includes("is not JSON")`)
	b.quiet("status of 400") // the browser itself logs a refused request
}

// TestKeyboardAlone uses no pointer: the form, the map with its cross, an area.
func TestKeyboardAlone(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, true, "")
	reached := map[string]bool{}
	var order []string
	for range 30 {
		b.run(chromedp.KeyEvent(kb.Tab))
		id := eval[string](b, "document.activeElement.id || document.activeElement.name || document.activeElement.textContent.trim()")
		if reached[id] {
			break
		}
		reached[id] = true
		order = append(order, id)
	}
	for _, want := range []string{"Skip to the answer", "where", "depth", "motion", "Look up", "API reference", "zoom-in", "zoom-out", "flat", "draw", "open", "share", "globe"} {
		if !reached[want] {
			t.Errorf("Tab does not reach %s; it reaches %v", want, order)
		}
	}
	b.run(chromedp.Focus("#where"), chromedp.KeyEvent("S33.5 W71.6"), chromedp.KeyEvent(kb.Enter))
	b.heading("Forearc")
	b.run(chromedp.Focus("#globe"))
	for range 7 {
		b.run(chromedp.KeyEvent(kb.ArrowLeft))
	}
	b.run(chromedp.KeyEvent(kb.Enter))
	b.wait("the answer at the cross", `document.querySelector("#panel .lead").textContent.includes("Nazca plate")`)
	b.shot("keyboard")

	b.run(chromedp.Focus("#draw"), chromedp.KeyEvent(kb.Enter), chromedp.Focus("#globe"), chromedp.KeyEvent(kb.Enter))
	for _, k := range []string{kb.ArrowRight, kb.ArrowUp} {
		b.run(chromedp.KeyEvent(k), chromedp.KeyEvent(k), chromedp.KeyEvent(kb.Enter))
	}
	b.run(chromedp.KeyEvent("f"))
	b.heading("Area")
	if got := eval[string](b, "location.hash"); !strings.Contains(got, "shape=") {
		t.Errorf("the link %q lacks the area", got)
	}
	b.quiet()
}

// axValue and axNode are what the test reads of Chromium's accessibility tree.
type axValue struct {
	Value any `json:"value"`
}

type axNode struct {
	ID         string   `json:"nodeId"`
	Children   []string `json:"childIds"`
	Ignored    bool     `json:"ignored"`
	Role       axValue  `json:"role"`
	Name       axValue  `json:"name"`
	Properties []struct {
		Name string `json:"name"`
	} `json:"properties"`
	BackendDOMNodeID int `json:"backendDOMNodeId"`
}

// inOrder returns the nodes of a tree, the first of which is its root, in the order
// in which they are read.
func inOrder(nodes []*axNode) (out []*axNode) {
	byID := map[string]*axNode{}
	for _, n := range nodes {
		byID[n.ID] = n
	}
	var visit func(n *axNode)
	visit = func(n *axNode) {
		out = append(out, n)
		for _, id := range n.Children {
			if c := byID[id]; c != nil {
				visit(c)
			}
		}
	}
	if len(nodes) > 0 {
		visit(nodes[0])
	}
	return out
}

// controls reads the accessibility tree that Chromium gives to assistive technology,
// fails where a control has no role or no name, and returns the names in reading order
// and how many there are of each role.
func controls(b *tab) (names []string, seen map[string]int) {
	b.t.Helper()
	var tree struct {
		Nodes []*axNode `json:"nodes"`
	}
	b.run(chromedp.ActionFunc(func(ctx context.Context) error {
		return cdp.Execute(ctx, "Accessibility.getFullAXTree", nil, &tree) // without cdproto's types, which know fewer properties than the browser
	}))
	roles := map[string]bool{"button": true, "textbox": true, "combobox": true, "checkbox": true, "link": true, "application": true,
		"region": true, "toolbar": true, "search": true, "form": true, "navigation": true, "image": true, "DisclosureTriangle": true}
	text := func(v axValue) string {
		s, _ := v.Value.(string)
		return s
	}
	seen = map[string]int{}
	for _, n := range inOrder(tree.Nodes) {
		role, focusable := text(n.Role), false
		for _, p := range n.Properties {
			if p.Name == "focusable" && role != "RootWebArea" && !n.Ignored {
				focusable = true
				seen["focusable"]++
				if role == "" || role == "generic" || role == "none" {
					b.t.Errorf("a control (node %d, %q) has the role %q", n.BackendDOMNodeID, text(n.Name), role)
				}
			}
		}
		if n.Ignored || !roles[role] && !focusable {
			continue
		}
		seen[role]++
		if strings.TrimSpace(text(n.Name)) == "" {
			b.t.Errorf("a %s (node %d) has no name", role, n.BackendDOMNodeID)
		}
		names = append(names, text(n.Name))
	}
	return names, seen
}

// TestAccessibilityTree: every control that Chromium gives to assistive technology
// has a role and a name, and they come in reading order.
func TestAccessibilityTree(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5")
	b.heading("Forearc")
	b.wait("the section", sectionShown)
	b.run(chromedp.Click("#legend summary"))
	names, seen := controls(b)
	if seen["button"] < 9 || seen["textbox"] < 2 || seen["checkbox"] != 5 || seen["image"] < 1 || seen["focusable"] < 19 {
		t.Errorf("the tree holds %v", seen)
	}
	last := -1
	for _, name := range []string{"Skip to", "nearmargin", "API reference", "Coordinates", "Depth", "Motion model", "Look up", "Map", "Map tools", "Zoom in", "Clear", "Map of plate", "Legend", "Plates", "Hotspots", "Answer", "Slab section", "Cross-section", "Save the figure", "curl command", "Copy the curl"} {
		at := slices.IndexFunc(names[last+1:], func(n string) bool { return strings.HasPrefix(n, name) })
		if at < 0 {
			t.Errorf("%q does not follow in %q", name, names)
			continue
		}
		last += 1 + at
	}
	// the order in which Tab goes is that in which the page is read
	if got := eval[[]string](b, `[...document.querySelectorAll("[tabindex]")].filter((e) => e.tabIndex > 0).map((e) => e.id)`); len(got) > 0 {
		t.Errorf("%q jump the queue", got)
	}

	drop(b, "two.csv", []byte("name,lon,lat\na,1,2\nb,-71.6,-33.5\n"))
	b.heading("two.csv")
	controls(b)
	drop(b, "columns.csv", []byte("name,x,y\nGorkha,85.3,27.7\n"))
	b.wait("the columns are asked for", `document.querySelector("#lon-column")`)
	controls(b)
	drop(b, "box.json", []byte(`{"type":"Polygon","coordinates":[[[-75,-40],[-65,-40],[-65,-30],[-75,-30],[-75,-40]]]}`))
	b.heading("Area")
	controls(b)
}

// TestServiceGoesAway: what is shown stays, the page says what is the matter, and
// the answer that was asked for comes when the service is back.
func TestServiceGoesAway(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5")
	b.heading("Forearc")
	h.stop()
	ask(b, "27.7 N 85.3 E")
	b.wait("the page says so", `!document.querySelector("#offline").hidden`)
	b.heading("Forearc")
	h.start()
	b.heading("Collision zone")
	b.wait("the note is gone", `document.querySelector("#offline").hidden`)

	// a file and a layer that were asked for meanwhile come too
	h.stop()
	drop(b, "two.csv", []byte("name,lon,lat\na,1,2\nb,-71.6,-33.5\n"))
	b.run(chromedp.Click("#legend summary"), chromedp.Click("#legend input[name=zones]"))
	b.wait("the page says so", `!document.querySelector("#offline").hidden`)
	h.start()
	b.heading("two.csv")
	b.wait("the zones", `performance.getEntriesByType("resource").some((e) => e.name.endsWith("/v1/zones") && e.responseStatus === 200)`)
	b.quiet("ERR_CONNECTION_REFUSED", "ERR_CONNECTION_RESET", "ERR_EMPTY_RESPONSE", "ERR_CONNECTION_CLOSED")
}

// TestServiceIsBusy: a service that refuses for the moment is not called unreachable, and
// the question is asked again.
func TestServiceIsBusy(t *testing.T) {
	var refused atomic.Int32
	ready := newHandler(t)
	h := &host{t: t, addr: "127.0.0.1:0", path: "/"}
	h.handler = http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.URL.Path != "/v1/point" || refused.Add(1) > 1 {
			ready.ServeHTTP(w, r)
			return
		}
		w.Header().Set("Content-Type", "application/problem+json")
		w.WriteHeader(http.StatusServiceUnavailable)
		_, _ = w.Write([]byte(`{"type":"about:blank","title":"Too much is asked","status":503,"errors":[{"parameter":"path","detail":"later"}]}`))
	})
	h.start()
	t.Cleanup(h.stop)
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5")
	b.wait("the page says why", `document.querySelector("#offline").textContent.startsWith("Too much is asked.") || document.querySelector("#panel h2").textContent === "Forearc"`)
	b.heading("Forearc")
	if refused.Load() < 2 {
		t.Error("nothing was refused")
	}
	b.quiet("status of 503")
}

// TestEditionChanges: when answers come from another edition, the map follows.
func TestEditionChanges(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5")
	b.heading("Forearc")
	b.run(chromedp.Evaluate(`(() => {
		const real = window.fetch;
		window.asked = [];
		window.fetch = async (path, o) => {
			window.asked.push(String(path));
			const r = await real(path, o);
			if (!String(path).includes("/v1/point")) return r;
			return new Response((await r.text()).replace(/"sha256":"[0-9a-f]+"/, '"sha256":"' + "0".repeat(64) + '"'), {status: r.status, headers: r.headers});
		};
	})()`, nil))
	ask(b, "27.7 N 85.3 E")
	b.heading("Collision zone")
	b.wait("the boundaries are asked for again", `window.asked.some((a) => a.endsWith("/v1/boundaries"))`)
	b.quiet()
}

// TestAsksNoOtherHost records every request of a whole visit.
func TestAsksNoOtherHost(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	var asked []string
	chromedp.ListenTarget(b.ctx, func(ev any) {
		if e, ok := ev.(*network.EventRequestWillBeSent); ok {
			b.mu.Lock()
			asked = append(asked, e.Request.URL)
			b.mu.Unlock()
		}
	})
	b.run(network.Enable(), chromedp.Reload())
	b.wait("the page is ready", `document.documentElement.dataset.ready === "yes"`)
	ask(b, "33.5 S 71.6 W")
	b.heading("Forearc")
	b.mu.Lock()
	defer b.mu.Unlock()
	if len(asked) < 15 {
		t.Errorf("only %d requests were seen", len(asked))
	}
	for _, u := range asked {
		if !strings.HasPrefix(u, b.url+"/") && !strings.HasPrefix(u, "blob:"+b.url) {
			t.Errorf("the page asked for %s", u)
		}
	}
}
