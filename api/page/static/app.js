// The map page: what happens when.
import { parse, words } from "./coords.js";
import { byId, el, say } from "./dom.js";
import { askJSON, HeldError, later, ProblemError } from "./service.js";
import { Globe } from "./globe.js";
import { attach } from "./input.js";
import { drawLegend } from "./legend.js";
import { platePolygons } from "./plates.js";
import { labelName, setPlateNames, showAnswer } from "./answer.js";
import { showArea } from "./area.js";
import { drawn, headerOf, readFile, ringsOf, showSites } from "./files.js";
import { areaOf, defaults, read, sitesOf, write } from "./state.js";
import { table } from "./paste.js";
import { attachToken } from "./token.js";

const globe = new Globe(byId("globe"));
const panel = byId("panel"), note = byId("read");
const welcome = [...panel.childNodes];
const title = document.title;
let state = read(location.hash, history.state);
let drawing = false;
let running = null; // the request for the answer that is wanted last
let lastFile = null; // {name, text} of the file taken last
let shownFile = null; // {name, got, packed, notes} of the file whose sites the map shows

// settle writes the state into the address.
let settleTimer = 0;
function settle(push) {
  clearTimeout(settleTimer);
  const { hash, kept } = write(state);
  if (push && hash !== location.hash) history.pushState(kept, "", hash);
  else history.replaceState(kept, "", hash);
}

globe.onmove = () => {
  state.view = globe.view;
  clearTimeout(settleTimer);
  settleTimer = setTimeout(() => settle(false), 250);
};

// attempt runs a request for an answer; while the service is away it waits.
async function attempt(name, f) {
  running?.abort();
  const mine = (running = new AbortController());
  panel.setAttribute("aria-busy", "true");
  try {
    await f(mine.signal);
  } catch (e) {
    if (e.name === "AbortError" || running !== mine) return;
    if (e instanceof HeldError) later("answer", () => attempt(name, f));
    else fault(name, e);
  } finally {
    if (running === mine) panel.removeAttribute("aria-busy");
  }
}

function fault(name, e) {
  const p = e instanceof ProblemError ? e.problem : { title: "That did not work" };
  panel.replaceChildren(el("h2", {}, p.title), el("p", {}, `${name}: ${e.message}`));
  if (lastFile && name === lastFile.name && /column/.test(e.message)) panel.append(columnForm());
  say(`${p.title}: ${e.message}`);
}

function pointQuery() {
  const q = [`lon=${state.site.lon}`, `lat=${state.site.lat}`];
  if (state.depth !== "") q.push(`depth_km=${encodeURIComponent(state.depth)}`);
  if (state.motion) q.push(`motion=${encodeURIComponent(state.motion)}`);
  return q.join("&");
}

function askPoint() {
  const query = pointQuery();
  globe.shown.wanted = [state.site.lon, state.site.lat];
  globe.redraw();
  return attempt(words(state.site.lon, state.site.lat), async (signal) => {
    const a = await askJSON(`v1/point?${query}`, { signal });
    globe.shown.answer = a;
    globe.shown.area = globe.shown.wanted = null;
    showAnswer(panel, a, query, backToSites());
    document.title = `${labelName(a.setting.label)}, ${words(a.site.lon, a.site.lat, 2)} · nearmargin`;
    say(`${labelName(a.setting.label)} on the ${a.plate.name} plate, confidence ${a.setting.confidence}`);
    globe.redraw();
    follow(a);
  });
}

// goTo answers for a place; the map comes along where it does not show it.
function goTo(lon, lat, travel) {
  state.site = { lon: +lon.toFixed(5), lat: +lat.toFixed(5) };
  state.area = null;
  if (travel) globe.look({ lon, lat, zoom: Math.max(globe.view.zoom, 6) });
  settle(true);
  return askPoint();
}

// backToSites leads from the answer for one site to the list it was chosen from.
function backToSites() {
  if (!shownFile) return null;
  const n = shownFile.got.sites.length;
  return el("p", {}, el("button", { type: "button", onclick: () => { state.site = null; settle(true); listSites(); } }, `All ${n} sites of ${shownFile.name}`));
}

// askArea answers for an area; name is that of the file it came from, "" if drawn.
function askArea(polygon, name) {
  return attempt(name || "Area", async (signal) => {
    const a = await askJSON("v1/area", { method: "POST", headers: { "Content-Type": "application/geo+json" }, body: JSON.stringify(polygon), signal });
    showArea(panel, a, polygon, name, [write(state).lacks]);
    globe.shown.answer = globe.shown.wanted = null;
    globe.shown.area = smallSide(polygon);
    document.title = "Area · nearmargin";
    say(`Area answered: ${Math.round(a.area_km2)} square kilometres`);
    globe.redraw();
    follow(a);
  });
}

// smallSide turns rings so that d3 fills the smaller side of each.
function smallSide(g) {
  const turn = (rings) => rings.map((r, i) => ((d3.geoArea({ type: "Polygon", coordinates: [r] }) > 2 * Math.PI) === (i === 0) ? r.slice().reverse() : r));
  return g.type === "Polygon" ? { type: g.type, coordinates: turn(g.coordinates) } : { type: g.type, coordinates: g.coordinates.map(turn) };
}

function takeArea(polygon, name) {
  state.site = null;
  state.area = ringsOf(polygon) && areaOf(polygon);
  settle(true);
  return askArea(polygon, name);
}

// withoutSeam returns the lines of a polygon without those along ±180°, where it was cut.
function withoutSeam(g) {
  const lines = [];
  for (const ring of g.type === "Polygon" ? g.coordinates : g.coordinates.flat()) {
    let line = [];
    ring.forEach((p, i) => {
      if (i && Math.abs(p[0]) === 180 && Math.abs(ring[i - 1][0]) === 180) line = [];
      line.push(p);
      if (line.length === 2) lines.push(line);
    });
  }
  return { type: "MultiLineString", coordinates: lines };
}

// drawing an area
function setDrawing(on) {
  drawing = on;
  globe.shown.draft = [];
  byId("draw").setAttribute("aria-pressed", String(on));
  byId("finish").hidden = true;
  say(on ? "Drawing: choose the corners of the area on the map, then finish" : "");
  note.textContent = on ? "Choose the corners on the map; Finish area, or F, closes it. Backspace takes the last corner back." : "";
  globe.redraw();
}

function corner(at) {
  globe.shown.draft.push(at.map((v) => +v.toFixed(4)));
  byId("finish").hidden = globe.shown.draft.length < 3;
  say(`Corner ${globe.shown.draft.length} at ${words(at[0], at[1], 2)}`);
  globe.redraw();
}

function finish() {
  if (!drawing || globe.shown.draft.length < 3) return;
  const ring = globe.shown.draft.filter((p, i, all) => !i || p.join() !== all[i - 1].join());
  setDrawing(false);
  if (ring.length >= 3) takeArea({ type: "Polygon", coordinates: [[...ring, ring[0]]] }, "");
}

attach(globe, {
  pick(x, y) {
    const at = globe.invert(x, y);
    if (!at) return say("That is beyond the edge of the map");
    if (drawing) return corner(at);
    const hit = globe.shown.sites.findLast((s) => s.xy && Math.hypot(s.xy[0] - x, s.xy[1] - y) < 9 * globe.k);
    note.textContent = "";
    if (hit) goTo(hit.lon, hit.lat);
    else goTo(at[0], at[1]);
  },
  finish,
  undo() { if (drawing) { globe.shown.draft.pop(); byId("finish").hidden = globe.shown.draft.length < 3; } },
  cancel() { if (drawing) setDrawing(false); },
});

// the form
function lookUp(from) {
  if (from.error) { note.textContent = `Not understood: ${from.error}.`; byId("where").setAttribute("aria-invalid", "true"); return; }
  byId("where").removeAttribute("aria-invalid");
  note.textContent = `Read as ${words(from.lon, from.lat)}${from.sure ? "." : " (latitude first)."}`;
  if (from.swapped) {
    note.append(el("button", { type: "button", onclick: () => { lookUp({ ...from.swapped, sure: true }); } }, `Longitude first: ${words(from.swapped.lon, from.swapped.lat, 2)}`));
  }
  goTo(from.lon, from.lat, true);
}

byId("search").addEventListener("submit", (e) => {
  e.preventDefault();
  const depth = byId("depth").value.trim().replace(",", ".").replace(/\s*km$/, "");
  if (depth !== "" && !Number.isFinite(Number(depth))) {
    note.textContent = `Depth: "${depth}" is not a number of kilometres, such as 25.`;
    return;
  }
  state.depth = depth;
  state.motion = byId("motion").value;
  if (byId("where").value.trim() === "" && state.site) { settle(true); askPoint(); return; }
  lookUp(parse(byId("where").value));
});

byId("where").addEventListener("paste", (e) => {
  const rows = table(e.clipboardData?.getData("text/plain") || "");
  if (!rows) return;
  e.preventDefault();
  note.textContent = "";
  take({ name: "pasted.csv", text: rows.text, note: rows.note });
});

// files
async function take(file, columns) {
  const text = file.text ?? (await file.blob.text());
  lastFile = { name: file.name, text };
  return attempt(file.name, async (signal) => {
    say(`Reading ${file.name}`);
    const got = await readFile(file.name, text, columns);
    if (signal.aborted) return;
    if (got.polygon) {
      const rings = ringsOf(got.polygon);
      if (rings) fit(rings.flat().map(([lon, lat]) => ({ lon, lat })));
      takeArea(got.polygon, file.name);
      return;
    }
    state.site = state.area = null;
    state.sites = got.sites.length ? sitesOf(file.name, got.sites) : null;
    shownFile = { name: file.name, got, packed: state.sites?.packed, notes: [file.note] };
    settle(true);
    listSites();
    fit(globe.shown.sites);
    say(`${got.sites.length} sites answered`);
  });
}

// listSites shows the sites of the file, on the map and in the panel.
function listSites() {
  globe.shown.answer = globe.shown.wanted = globe.shown.area = null;
  globe.shown.sites = drawn(shownFile.got);
  showSites(panel, shownFile.name, shownFile.got, globe.p.dark, [...shownFile.notes, write(state).lacks], (s) => goTo(s.lon, s.lat, true));
  document.title = `${shownFile.name} · nearmargin`;
  globe.redraw();
}

// bringSites asks again for the sites of a link, or takes those that are here.
async function bringSites(sites) {
  if (shownFile?.packed === sites.packed) return;
  const cell = (s) => `"${s.replace(/"/g, '""')}"`;
  const text = "name,lon,lat\n" + sites.list.map((s) => `${cell(s.name)},${s.lon},${s.lat}\n`).join("");
  const got = await readFile(sites.name, text);
  shownFile = { name: sites.name, got, packed: sites.packed, notes: ["Read from the link: its places, to a metre, and names; other columns are in the file alone."] };
}

// fit turns the map to where the sites are.
function fit(sites) {
  if (!sites.length) return;
  const many = { type: "MultiPoint", coordinates: sites.map((s) => [s.lon, s.lat]) };
  const c = d3.geoCentroid(many);
  if (!c.every(Number.isFinite)) return;
  const reach = Math.max(...sites.map((s) => d3.geoDistance(c, [s.lon, s.lat])));
  if (reach > 1.3 && !globe.flat) setFlat(true);
  globe.look({ lon: c[0], lat: c[1], zoom: Math.max(1, Math.min(12, 0.9 * globe.zoomFor(reach))) });
}

// columnForm asks which columns of the table are meant.
function columnForm() {
  const names = headerOf(lastFile.text);
  const choice = (id) => el("select", { id }, names.map((n) => el("option", { value: n }, n)));
  const lon = choice("lon-column"), lat = choice("lat-column");
  return el("form", { "aria-label": "Columns", onsubmit: (e) => { e.preventDefault(); take(lastFile, { lon: lon.value, lat: lat.value }); } },
    el("p", {}, el("label", { for: "lon-column" }, "Column of longitudes "), lon), el("p", {}, el("label", { for: "lat-column" }, "Column of latitudes "), lat),
    el("button", { type: "submit" }, "Try again"));
}

byId("open").addEventListener("click", () => byId("file").click());
byId("file").addEventListener("change", (e) => {
  const f = e.target.files[0];
  if (f) take({ name: f.name, blob: f });
  e.target.value = "";
});
let within = 0;
const holdsFile = (e) => [...(e.dataTransfer?.types || [])].includes("Files");
addEventListener("dragenter", (e) => { if (holdsFile(e)) { within++; byId("drop").hidden = false; } });
addEventListener("dragleave", (e) => { if (holdsFile(e) && --within <= 0) { within = 0; byId("drop").hidden = true; } });
addEventListener("dragover", (e) => { if (holdsFile(e)) e.preventDefault(); });
addEventListener("drop", (e) => {
  within = 0;
  byId("drop").hidden = true;
  const f = e.dataTransfer?.files[0];
  if (!f) return;
  e.preventDefault();
  take({ name: f.name, blob: f });
});

// tools
function setFlat(on) {
  state.flat = globe.flat = on;
  byId("flat").setAttribute("aria-pressed", String(on));
  globe.redraw();
}
byId("zoom-in").addEventListener("click", () => globe.zoomBy(1.6));
byId("zoom-out").addEventListener("click", () => globe.zoomBy(1 / 1.6));
byId("flat").addEventListener("click", () => { setFlat(!globe.flat); settle(false); });
byId("draw").addEventListener("click", () => setDrawing(!drawing));
byId("finish").addEventListener("click", finish);
byId("share").addEventListener("click", async () => {
  settle(false);
  const holds = write(state).lacks || "It shows what you see.";
  try {
    await navigator.clipboard.writeText(location.href);
    note.textContent = `The link is copied. ${holds}`;
  } catch {
    note.textContent = `Copy the link from the address bar. ${holds}`;
  }
});

byId("clear").addEventListener("click", () => {
  setDrawing(false);
  byId("where").value = "";
  show({ ...defaults(), view: state.view, flat: state.flat, layers: state.layers, motion: state.motion });
  settle(true);
  note.textContent = "";
  say("Cleared");
});

// layers
const layerPaths = { slabs: "v1/slabs", zones: "v1/zones", hotspots: "v1/hotspots" };
async function needLayer(name) {
  if (!layerPaths[name] || globe.data[name]) return;
  try {
    const got = (await askJSON(layerPaths[name])).features;
    globe.data[name] = name === "zones" ? got.map((f) => ({ ...f, geometry: smallSide(f.geometry), outline: withoutSeam(f.geometry) })) : got;
    globe.redraw();
  } catch (e) {
    if (e instanceof HeldError) later(name, () => needLayer(name));
    else note.textContent = `The layer ${name} could not be read: ${e.message}.`;
  }
}
function setLayers(layers) {
  state.layers = globe.layers = layers;
  for (const box of document.querySelectorAll("#legend input")) box.checked = layers.has(box.name);
  for (const name of layers) needLayer(name);
  globe.redraw();
}
byId("legend").addEventListener("change", () => {
  setLayers(new Set([...document.querySelectorAll("#legend input:checked")].map((b) => b.name)));
  settle(false);
});

matchMedia("(prefers-color-scheme: dark)").addEventListener("change", drawLegend);

// loading: each part by itself, so that one which is slow or lost holds up no other
async function load(name, f) {
  try {
    await f();
    globe.redraw();
  } catch (e) {
    if (e instanceof HeldError) later(name, () => load(name, f));
    else note.textContent = `The ${name} could not be read: ${e.message}.`;
  }
}
const landOf = async (file) => {
  const t = await askJSON(`assets/vendor/${file}`);
  return topojson.feature(t, t.objects.land);
};

// loadModel fetches what the map shows of the active model.
let shownModel = "";
async function loadModel() {
  const [lines, plates, models] = await Promise.all([askJSON("v1/boundaries"), askJSON("v1/plates"), askJSON("v1/models")]);
  const names = new Map(plates.plates.map((p) => [p.code, p.name]));
  setPlateNames(names);
  shownModel = plates.model.sha256;
  globe.data.boundaries = lines.features;
  globe.data.plates = platePolygons(lines, names);
  const active = models.models.find((m) => m.active);
  byId("motion").replaceChildren(el("option", { value: "" }, active.default_motion), ...active.motion_models.filter((m) => m.name !== active.default_motion).map((m) => el("option", { value: m.name }, m.name)));
  byId("motion").value = state.motion;
  if (globe.shown.answer && state.site) showAnswer(panel, globe.shown.answer, pointQuery(), backToSites()); // with the plates' names
}

// follow fetches the model again where an answer comes from another edition than the
// map shows.
function follow(a) {
  if (!shownModel || a.model.sha256 === shownModel) return;
  shownModel = "";
  for (const name of Object.keys(layerPaths)) globe.data[name] = null;
  load("model", loadModel);
  for (const name of state.layers) needLayer(name);
}

// show brings the page to a state, as at the start and when going back.
function show(s) {
  state = s;
  Object.assign(globe, { view: s.view, flat: s.flat });
  byId("flat").setAttribute("aria-pressed", String(s.flat));
  byId("depth").value = s.depth;
  byId("motion").value = s.motion;
  setLayers(s.layers);
  globe.shown.answer = globe.shown.wanted = globe.shown.area = null;
  if (!s.sites) {
    shownFile = null;
    globe.shown.sites = [];
  }
  globe.redraw();
  if (s.sites) return attempt(s.sites.name, () => bring(s));
  return answer(s);
}

// bring shows the sites of a state, then the answer that is asked for beside them.
async function bring(s) {
  await bringSites(s.sites);
  if (state !== s) return;
  listSites();
  answer(s);
}

function answer(s) {
  if (s.site) return askPoint();
  if (s.area) return askArea(s.area.geometry, "");
  if (s.sites) return null;
  running?.abort();
  panel.removeAttribute("aria-busy");
  panel.replaceChildren(...welcome);
  document.title = title;
  return null;
}

async function start() {
  attachToken();
  drawLegend();
  byId("legend").open = matchMedia("(min-width: 1700px)").matches;
  show(state);
  addEventListener("popstate", (e) => show(read(location.hash, e.state)));
  await Promise.all([
    load("land", async () => { globe.data.land = await landOf("land-110m.json"); }),
    load("model", loadModel),
  ]);
  document.documentElement.dataset.ready = "yes";
  load("fine land", async () => { globe.data.fine = await landOf("land-50m.json"); });
}

start();
