package page_test

import (
	"encoding/base64"
	"encoding/json"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/chromedp/chromedp"

	"nearmargin/api"
)

// open leaves the page and opens a link in the same tab, as somebody who was sent it.
func (b *tab) open(link string) {
	b.t.Helper()
	b.run(chromedp.Navigate("about:blank"), chromedp.Navigate(b.url+b.path+link))
	b.wait("the page is ready", `document.documentElement.dataset.ready === "yes"`)
}

// hash returns the link once the view has settled.
func (b *tab) hash() string {
	b.t.Helper()
	b.run(chromedp.Evaluate("new Promise((r) => setTimeout(r, 400))", nil))
	return eval[string](b, "location.hash")
}

// ring writes a regular polygon around a place.
func ring(lon, lat, reach float64, corners int) string {
	var p []string
	for i := range corners {
		a := float64(i) / float64(corners) * 2 * math.Pi
		p = append(p, fmt.Sprintf("[%.6f,%.6f]", lon+reach*math.Cos(a), lat+reach*math.Sin(a)))
	}
	return "[" + strings.Join(append(p, p[0]), ",") + "]"
}

// TestLinksHoldAreas: an outline with many corners, one with a hole and one of several
// parts come back from a link and from reloading, with the same numbers.
func TestLinksHoldAreas(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	var before []string
	for name, polygon := range map[string]string{
		"corners": `{"type":"Polygon","coordinates":[` + ring(-70, -30, 4, 300) + `]}`,
		"hole":    `{"type":"Feature","properties":{"name":"x"},"geometry":{"type":"Polygon","coordinates":[` + ring(-70, -30, 6, 40) + `,` + ring(-70, -30, 3, 20) + `]}}`,
		"parts":   `{"type":"MultiPolygon","coordinates":[[` + ring(179.5, -20, 2, 30) + `],[` + ring(-70, -30, 3, 70) + `,` + ring(-70, -30, 1, 9) + `]]}`,
	} {
		t.Run(name, func(t *testing.T) {
			b.t = t
			drop(b, name+".geojson", []byte(polygon))
			b.wait("the area's answer", fmt.Sprintf(`document.querySelector("#panel .place")?.textContent === %q`, name+".geojson"))
			lead, link := textOf(b, "#panel .lead"), b.hash()
			if strings.Contains(strings.Join(before, "\n"), lead) {
				t.Fatalf("the answer is another area's: %s", lead)
			}
			before = append(before, lead)
			if strings.Contains(textOf(b, "#panel"), "The link holds the view") || !strings.Contains(link, "shape=") || len(link) > 6200 {
				t.Fatalf("the link has %d characters: %.80s", len(link), link)
			}
			b.run(chromedp.Reload())
			same := fmt.Sprintf(`document.querySelector("#panel .lead")?.textContent === %q`, lead)
			b.wait("the same answer when reloaded", same)
			b.open("#view=0,0,1")
			b.heading("In what tectonic setting does a place lie?")
			b.open(link)
			b.wait("the same answer from the link", same)
		})
	}
	b.t = t

	drop(b, "coast.geojson", []byte(`{"type":"Polygon","coordinates":[`+ring(-70, -30, 4, 4000)+`]}`))
	b.wait("the page says that the link lacks the area", `document.querySelector("#panel").textContent.includes("The link holds the view, not this area")`)
	if link := b.hash(); strings.Contains(link, "shape=") || len(link) > 300 {
		t.Errorf("the link has %d characters: %.80s", len(link), link)
	}
	if got := textOf(b, "#panel pre"); !strings.Contains(got, "--data-binary '@coast.geojson'") {
		t.Errorf("the command is %.200q", got)
	}
	b.run(chromedp.Click("#share"))
	b.wait("and when it is copied", `document.querySelector("#read").textContent.includes("not this area")`)
	lead := textOf(b, "#panel .lead")
	b.run(chromedp.Reload())
	b.wait("this tab keeps it", fmt.Sprintf(`document.querySelector("#panel .lead")?.textContent === %q`, lead))

	// a link written by hand
	b.open("#area=-75,-40;-65,-40;-65,-30;-75,-30&view=-70,-35,4")
	b.heading("Area")
	b.quiet()
}

// sitesTable is a table of n made-up samples along the Andes.
func sitesTable(n int, name string) []byte {
	var s strings.Builder
	s.WriteString("sample;rock;lat;lon\n")
	for i := range n {
		fmt.Fprintf(&s, "%s %d;andesite;%.4f;%.4f\n", name, i+1, -45+float64(i)*60/float64(n), -73+float64(i%7)*0.9)
	}
	return []byte(s.String())
}

// TestLinksHoldSites: 200 sites with their names come back; with long names their
// places do; thousands do not, and the page says so.
func TestLinksHoldSites(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	counts := `JSON.stringify([...document.querySelectorAll("#panel table tr")].map((r) => r.textContent))`

	drop(b, "samples.csv", sitesTable(200, "Condor"))
	b.heading("samples.csv")
	want, link := eval[string](b, counts), b.hash()
	if len(link) > 6200 || !strings.Contains(link, "sites=") {
		t.Fatalf("the link has %d characters: %.80s", len(link), link)
	}
	if got := textOf(b, "#panel"); strings.Contains(got, "The link holds") || !strings.Contains(got, "--data-binary '@samples.csv'") {
		t.Errorf("the panel says %.400q", got)
	}
	b.run(chromedp.Reload())
	b.heading("samples.csv")
	if got := eval[string](b, counts); got != want {
		t.Errorf("reloaded: %s, want %s", got, want)
	}
	b.open(link)
	b.heading("samples.csv")
	if got := eval[string](b, counts); got != want {
		t.Errorf("from the link: %s, want %s", got, want)
	}
	if got := textOf(b, "#panel"); !strings.Contains(got, "Condor 137:") || !strings.Contains(got, "Read from the link") {
		t.Errorf("from the link the panel says %.300q", got)
	}

	// one of them, back to all, and by the browser's own way back
	b.run(chromedp.Click(".sites li:nth-child(40) button"))
	b.wait("an answer", `document.querySelector("#panel .conf")`)
	if one := b.hash(); !strings.Contains(one, "sites=") || !strings.Contains(one, "site=-") {
		t.Errorf("the link holds not both: %.120s", one)
	}
	b.run(chromedp.Click("#panel h2 + p button"))
	b.heading("samples.csv")
	b.run(chromedp.Evaluate("history.back()", nil))
	b.wait("the answer again", `document.querySelector("#panel .conf")`)
	b.run(chromedp.Evaluate("history.back()", nil))
	b.heading("samples.csv")
	b.run(chromedp.Click("#clear"))
	b.heading("In what tectonic setting does a place lie?")
	if link := b.hash(); strings.Contains(link, "site") {
		t.Errorf("cleared, the link is %.80s", link)
	}

	drop(b, "long.csv", sitesTable(400, "Quebrada de los Condores, outcrop"))
	b.heading("long.csv")
	if got := textOf(b, "#panel"); !strings.Contains(got, "not their names") {
		t.Errorf("the panel says %.300q", got)
	}
	want, link = eval[string](b, counts), b.hash()
	b.open(link)
	b.heading("long.csv")
	if got := eval[string](b, counts); got != want || !strings.Contains(textOf(b, ".sites"), "row 7:") {
		t.Errorf("from the link: %s, want %s", got, want)
	}

	drop(b, "many.csv", sitesTable(4000, "C"))
	b.heading("many.csv")
	if got := textOf(b, "#panel"); !strings.Contains(got, "The link holds the view, not the file: its 4,000 sites") {
		t.Errorf("the panel says %.300q", got)
	}
	if link := b.hash(); len(link) > 300 {
		t.Errorf("the link has %d characters", len(link))
	}
	b.run(chromedp.Reload())
	b.heading("many.csv") // this tab keeps them
	b.quiet()
}

// TestCodec: what is packed comes back, to a metre; what is cut off or no such text is
// refused without harm.
func TestCodec(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 800, 600, false, "")
	if got := eval[string](b, `import("/assets/codec.js").then((m) => {
		let seed = 7;
		const random = () => (seed = (seed * 16807) % 2147483647) / 2147483647;
		const near = (a, b) => Math.abs(a - b) <= 0.5000001e-5;
		for (let k = 0; k < 200; k++) {
			const ring = () => { const r = Array.from({ length: 3 + Math.floor(random() * 9) }, () => [random() * 540 - 180, random() * 180 - 90]); return [...r, r[0]]; };
			const polygon = () => Array.from({ length: 1 + Math.floor(random() * 3) }, ring);
			const g = random() < 0.5 ? { type: "Polygon", coordinates: polygon() } : { type: "MultiPolygon", coordinates: [polygon(), polygon()] };
			const text = m.packArea(g), back = m.unpackArea(text);
			const flat = (x) => x.coordinates.flat(9);
			if (!/^[\w-]+$/.test(text) || back.type !== g.type || flat(back).length !== flat(g).length || !flat(back).every((v, i) => near(v, flat(g)[i]))) return "area " + JSON.stringify(g);
			for (const n of [1, text.length >> 1, text.length - 2]) if (m.unpackArea(text.slice(0, n)) !== null) return "cut off at " + n + ": " + text;
			const list = Array.from({ length: 1 + Math.floor(random() * 20) }, (_, i) => ({ lon: random() * 360 - 180, lat: random() * 180 - 90, name: ["", "Süd-1", "北斎 7", "a,\"b\"'", "\u{1f30b}"][i % 5] }));
			const got = m.unpackSites(m.packSites(list, true));
			if (got.length !== list.length || !got.every((s, i) => near(s.lon, list[i].lon) && near(s.lat, list[i].lat) && s.name === list[i].name)) return "sites " + JSON.stringify(list);
			if (m.unpackSites(m.packSites(list, false)).some((s) => s.name !== "")) return "names";
		}
		for (const bad of ["", "!", "AA", "__________", "A".repeat(9), "AQD_____fw"]) if (m.unpackArea(bad) !== null || m.unpackSites(bad) !== null) return "took " + bad;
		return "fine";
	})`); got != "fine" {
		t.Error(got)
	}
	b.open("#shape=AQED64ag&sites=AAAA&site=1000,2&view=x&layers=plates,nothing") // the page opens all the same
	b.heading("In what tectonic setting does a place lie?")
	b.quiet()
}

// TestBelowABasePath walks through the page where a proxy shows the service below a
// path, with and without the slash at the end.
func TestBelowABasePath(t *testing.T) {
	h := newHost(t, func(c *api.Config) { c.BasePath = "/maps/tectonics" })
	h.path = "/maps/tectonics"
	b := newTab(t, h, 1280, 800, false, "#site=-71.6,-33.5&layers=plates,boundaries,slabs,zones,hotspots")
	if got := eval[string](b, "location.pathname + location.hash"); !strings.HasPrefix(got, "/maps/tectonics/#site=-71.6,-33.5") {
		t.Errorf("the page is at %s", got)
	}
	b.heading("Forearc")
	b.wait("the section", sectionShown)
	if got := textOf(b, "#panel pre"); !strings.Contains(got, b.url+"/maps/tectonics/v1/point?lon=-71.6") {
		t.Errorf("the command is %q", got)
	}
	drop(b, "two.csv", []byte("name,lon,lat\na,1,2\nb,-71.6,-33.5\n"))
	b.heading("two.csv")
	b.run(chromedp.Navigate(eval[string](b, `document.querySelector("header nav a").href`)))
	b.wait("the reference page", `document.querySelector("main h2")?.textContent === "API reference"`)
	if got := eval[string](b, `getComputedStyle(document.querySelector(".doc main")).maxWidth`); got == "none" {
		t.Error("the reference page has no styles")
	}
	links := eval[[]string](b, `[...new Set([...document.querySelectorAll("a[href], link[href]")].map((a) => a.href.replace(/#.*/, "")))]`)
	for _, l := range links {
		if !strings.HasPrefix(l, b.url+"/maps/tectonics/") {
			t.Errorf("a link leads to %s", l)
		}
	}
	if eval[int](b, `fetch("openapi.json").then((r) => r.status)`) != 200 || len(links) < 4 {
		t.Errorf("the links are %q", links)
	}
	b.quiet()
}

// TestPastedRows pastes a table and a list of places into the field for one.
func TestPastedRows(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	paste := func(text string) {
		quoted, _ := json.Marshal(text)
		b.run(chromedp.Evaluate(fmt.Sprintf(`(() => {
			const d = new DataTransfer();
			d.setData("text/plain", %s);
			const e = new ClipboardEvent("paste", { clipboardData: d, bubbles: true, cancelable: true }), field = document.querySelector("#where");
			field.value = "";
			if (field.dispatchEvent(e)) field.value = d.getData("text/plain");
		})()`, quoted), nil))
	}
	paste("Well\tLatitude\tLongitude\tDepth\nCondor-1\t-33.5\t-71.6\t12\nCondor-2\t27.7\t85.3\t3\n")
	b.heading("pasted.csv")
	if got := textOf(b, ".sites"); !strings.Contains(got, "Condor-1: forearc") || !strings.Contains(got, "Condor-2: collision zone") {
		t.Errorf("the list is %q", got)
	}
	paste("33.5 S 71.6 W\r\n27.7, 85.3\r\nno place\r\nWell B;33°27'S;70°40'W;12")
	b.wait("the list of places", `document.querySelectorAll(".sites li").length === 3`)
	if got := textOf(b, "#panel"); !strings.Contains(got, "1 of 4 lines were not understood") || !strings.Contains(got, "Latitude was read first") {
		t.Errorf("the panel says %.300q", got)
	}
	paste("33.5 S 71.6 W\n")
	b.run(chromedp.Click("#search button"))
	b.heading("Forearc")
	b.quiet()
}

// TestMessyTables drops tables as people have them.
func TestMessyTables(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "")
	for name, c := range map[string]struct{ table, want string }{
		"semicolons.csv": {"Probe;Breite;lat;lon;Höhe\nA;x;-33,5;-71,6;3\nB;y;27,7;85,3;\n", "2 sites have an answer"},
		"blanks.csv":     {"\ufeff id , Longitude (deg) , Latitude (deg)\r\n 7 , -71.6 , -33.5 \r\n\r\n8,,\r\n9,500,2\r\n", "1 site has an answer, 2 rows have none"},
		"quotes.csv":     {"name,lat,lon\n\"Say \"\"x\"\", then\nnext\",-33.5,-71.6\n<b>bold</b>,27.7,85.3\n", "2 sites have an answer"},
	} {
		drop(b, name, []byte(c.table))
		b.heading(name)
		if got := textOf(b, "#panel .lead"); !strings.Contains(got, c.want) {
			t.Errorf("%s: %q, want %q", name, got, c.want)
		}
	}
	drop(b, "both.csv", []byte("lat,lat_wgs84,lon\n1,-33.5,-71.6\n"))
	b.wait("the columns are asked for", `document.querySelector("#lat-column")`)
	b.run(chromedp.SetValue("#lon-column", "lon"), chromedp.SetValue("#lat-column", "lat_wgs84"), chromedp.Click("#panel form button"))
	b.heading("both.csv")
	if got := textOf(b, ".sites"); !strings.Contains(got, "forearc") {
		t.Errorf("the list is %q", got)
	}
	drop(b, "empty.csv", nil)
	b.wait("an empty file is refused in words", `/empty/i.test(document.querySelector("#panel").textContent)`)
	drop(b, "picture.png", bytesOf("iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR4nGNgYGD4DwABBAEAX+XDSwAAAABJRU5ErkJggg=="))
	b.wait("a picture is refused in words", `document.querySelector("#panel p").textContent.startsWith("picture.png")`)
	b.quiet("status of 400", "status of 415")
}

func bytesOf(text string) []byte {
	b, err := base64.StdEncoding.DecodeString(text)
	if err != nil {
		panic(err)
	}
	return b
}

// TestEdgesOfTheMap asks at the poles and at the antimeridian.
func TestEdgesOfTheMap(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1280, 800, false, "#layers=plates,boundaries,slabs,zones,hotspots")
	for _, c := range []struct{ text, place string }{
		{"90 N 0 E", "90.0000° N, 0.0000° E"}, {"90 S 12 W", "90.0000° S"}, {"16.5 S 180 W", "16.5000° S, 180.0000° E"},
		{"-16.5, 180", "16.5000° S, 180.0000° E"}, {"-16.5, 359.5", "16.5000° S, 0.5000° W"},
	} {
		ask(b, c.text)
		b.wait(c.text, fmt.Sprintf(`document.querySelector("#panel .place")?.textContent.startsWith(%q) && !document.querySelector("#panel").hasAttribute("aria-busy")`, c.place))
		b.shot("edge-" + strings.Map(func(r rune) rune {
			if r == ' ' || r == ',' {
				return '-'
			}
			return r
		}, c.text))
	}
	b.quiet()
}
