// Files that are dropped: sites in CSV or GeoJSON, or a polygon.
import { ask, curl } from "./service.js";
import { el, fill, symbol } from "./dom.js";
import { command, labelName } from "./answer.js";
import { siteColour, siteShape, labelWords } from "./symbols.js";

const mostBytes = 20 << 20, mostListed = 200, mostDrawn = 20000;

// readFile returns {polygon}, or {sites, text, type, errors} from the service's answer.
export async function readFile(name, text, columns = {}) {
  if (text.length > mostBytes) throw new Error(`the file has ${(text.length / 1048576).toFixed(0)} MiB; the page takes 20, nearmargin annotate on the command line takes any size`);
  if (/^\ufeff?\s*[{[]/.test(text)) {
    let doc;
    try { doc = JSON.parse(text.replace(/^\ufeff/, "")); } catch (e) { throw new Error(`${name} is not JSON: ${e.message}`); }
    const polygon = onlyPolygon(doc);
    if (polygon) return { polygon };
    return geojson(doc, text);
  }
  return csv(text, columns);
}

// onlyPolygon returns the polygon of a document that holds nothing else, without heights.
function onlyPolygon(doc) {
  const one = doc?.type === "FeatureCollection" && doc.features?.length === 1 ? doc.features[0] : doc;
  const g = one?.type === "Feature" ? one.geometry : one;
  if (g?.type !== "Polygon" && g?.type !== "MultiPolygon") return null;
  const flat = (c) => (Array.isArray(c?.[0]) ? c.map(flat) : Array.isArray(c) ? c.slice(0, 2) : c);
  return { type: g.type, coordinates: flat(g.coordinates) };
}

// ringsOf returns all rings of a polygon, null where one is no closed ring: then it is
// for the service to say what is wrong.
export function ringsOf(g) {
  const rings = g.type === "Polygon" ? g.coordinates : Array.isArray(g.coordinates) ? g.coordinates.flat() : null;
  const position = (p) => Array.isArray(p) && p.length === 2 && p.every(Number.isFinite);
  const closed = (r) => Array.isArray(r) && r.length >= 4 && r.every(position) && r[0].join() === r[r.length - 1].join();
  return Array.isArray(rings) && rings.length && rings.every(closed) ? rings : null;
}

// headerOf returns the names of a table's columns.
export function headerOf(text) {
  const line = text.replace(/^\ufeff/, "").split(/[\r\n]/, 1)[0];
  const sep = [",", ";", "\t"].reduce((a, b) => (line.split(b).length > line.split(a).length ? b : a));
  return d3.dsvFormat(sep).parseRows(line)[0] || [];
}

async function geojson(doc, text) {
  const type = "application/geo+json";
  const body = doc.type === "Point" ? JSON.stringify({ type: "Feature", properties: null, geometry: doc }) : text;
  const out = await ask("v1/annotate", { method: "POST", headers: { "Content-Type": type }, body });
  const got = JSON.parse(out);
  const sites = [];
  let errors = 0;
  for (const [i, f] of (got.features || [got]).entries()) {
    const p = f.properties || {}, t = p.tectonic;
    if (!t) { errors++; continue; }
    if (!t.site) continue; // an area among sites
    sites.push({ lon: t.site.lon, lat: t.site.lat, label: t.setting.label, family: t.setting.family, confidence: t.setting.confidence, name: String(p.name ?? p.id ?? f.id ?? `feature ${i + 1}`) });
  }
  return { sites, text: out, type, ending: "geojson", errors, query: "" };
}

const lonForm = /^(lon|long|longitude)([\s_(\[].*)?$/i, latForm = /^(lat|latitude)([\s_(\[].*)?$/i;

async function csv(text, columns) {
  const q = new URLSearchParams();
  if (columns.lon) q.set("lon_column", columns.lon);
  if (columns.lat) q.set("lat_column", columns.lat);
  const out = await ask(`v1/annotate${String(q) && "?" + q}`, { method: "POST", headers: { "Content-Type": "text/csv" }, body: text });
  const header = out.slice(0, out.search(/[\r\n]/));
  const sep = [",", ";", "\t"].reduce((a, b) => (header.split(b).length > header.split(a).length ? b : a));
  const rows = d3.dsvFormat(sep).parseRows(out.replace(/^\ufeff/, ""));
  const head = rows[0], at = (n) => head.indexOf(n);
  const lon = columns.lon ? at(columns.lon) : head.findIndex((h) => lonForm.test(h.trim()));
  const lat = columns.lat ? at(columns.lat) : head.findIndex((h) => latForm.test(h.trim()));
  const name = [/name|site|station|well|sample/i, /^(id|key|code)$/i].map((re) => head.findIndex((h) => re.test(h) && !h.startsWith("ts_"))).find((i) => i >= 0);
  const sites = [], label = at("ts_setting"), family = at("ts_family"), conf = at("ts_confidence");
  let errors = 0;
  const degrees = (s) => Number(s.trim().replace(",", "."));
  for (const [i, r] of rows.slice(1).entries()) {
    if (r.length === 1 && r[0] === "") continue;
    if (!r[label]) { errors++; continue; }
    const x = degrees(r[lon]), y = degrees(r[lat]);
    if (Number.isFinite(x) && Number.isFinite(y)) sites.push({ lon: x > 180 ? x - 360 : x, lat: y, label: r[label], family: r[family], confidence: r[conf], name: (name === undefined ? "" : r[name]) || `row ${i + 1}` });
  }
  return { sites, text: out, type: "text/csv", ending: "csv", errors, query: String(q) };
}

let saved = ""; // the address of the file that can be saved

// showSites fills the panel with what a file held, and notes on it.
export function showSites(panel, name, got, dark, notes, onpick) {
  const counts = new Map();
  for (const s of got.sites) counts.set(s.label, { n: (counts.get(s.label)?.n || 0) + 1, family: s.family });
  const order = Object.keys(labelWords), stem = name.replace(/\.[^.]*$/, "");
  URL.revokeObjectURL(saved);
  saved = URL.createObjectURL(new Blob([got.text], { type: got.type }));
  const low = got.sites.filter((s) => s.confidence === "low").length;
  fill(
    panel,
    el("h2", {}, name),
    el("p", { class: "lead" }, `${got.sites.length} ${got.sites.length === 1 ? "site has" : "sites have"} an answer${got.errors ? `, ${got.errors} ${got.errors === 1 ? "row has" : "rows have"} none` : ""}${low ? `; ${low} of low confidence (open markers)` : ""}.`),
    notes.filter(Boolean).map((n) => el("p", { class: "sub" }, n)),
    got.sites.length > mostDrawn ? el("p", {}, `The map shows the first ${mostDrawn}.`) : null,
    el("p", {}, el("a", { href: saved, download: `${stem}-annotated.${got.ending}` }, "Save the annotated file")),
    el("h3", {}, "Settings"),
    el("table", {}, el("caption", { class: "away" }, "Sites by setting"), el("tbody", {}, [...counts].sort((a, b) => order.indexOf(a[0]) - order.indexOf(b[0]))
      .map(([label, c]) => el("tr", {}, el("th", { scope: "row" }, symbol(siteShape(label), siteColour(c.family, dark)), labelName(label)), el("td", { class: "num" }, String(c.n)))))),
    el("h3", {}, "Sites"),
    el("ol", { class: "sites" }, got.sites.slice(0, mostListed).map((s) => el("li", {}, el("button", { type: "button", onclick: () => onpick(s) }, symbol(siteShape(s.label), siteColour(s.family, dark)), `${s.name}: ${labelName(s.label).toLowerCase()}`)))),
    got.sites.length > mostListed ? el("p", { class: "sub" }, `The first ${mostListed} are listed; the saved file has all.`) : null,
    ...command(curl(`v1/annotate${got.query && "?" + got.query}`, "-H", `Content-Type: ${got.type}`, "--data-binary", `@${name}`, "-o", `${stem}-annotated.${got.ending}`)),
  );
  panel.scrollTop = 0;
}

// drawn are the sites of a file that the map shows.
export const drawn = (got) => got.sites.slice(0, mostDrawn);
