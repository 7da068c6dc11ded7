// The answer for a place, in plain language and in numbers.
import { el, fill, copyButton } from "./dom.js";
import { words } from "./coords.js";
import { ask, curl, HeldError, later } from "./service.js";
import { labelWords, typeWords } from "./symbols.js";

const compass = ["north", "north-northeast", "northeast", "east-northeast", "east", "east-southeast", "southeast", "south-southeast",
  "south", "south-southwest", "southwest", "west-southwest", "west", "west-northwest", "northwest", "north-northwest"];

export const direction = (deg) => compass[Math.round(deg / 22.5) % 16];

const minus = (s) => String(s).replace("-", "\u2212");

// num writes a number with its σ and unit.
export function num(x, sigma, unit, decimals = 1) {
  if (x === null || x === undefined) return "not known";
  const s = sigma === null || sigma === undefined ? "" : ` ± ${sigma.toFixed(decimals)}`;
  return `${minus(x.toFixed(decimals))}${s} ${unit}`;
}

export const km = (x) => (x >= 100 ? Math.round(x).toLocaleString("en") : x.toFixed(1));

// kmSigma writes a distance with its σ, both to the same decimals.
const kmSigma = (x, sigma) => `${km(x)} ± ${x >= 100 ? Math.max(1, Math.round(sigma)) : sigma.toFixed(1)} km`;

export const labelName = (label) => (labelWords[label] || [label])[0];

// the puts an article before a feature's name that wants one.
const the = (name) => (/^(the|gulf of|gulfs of) /i.test(name) ? name : `the ${name}`);

const plateNames = new Map();

export function setPlateNames(names) {
  for (const [code, name] of names) plateNames.set(code, name);
}

export const plateName = (code) => `${plateNames.get(code) || code} plate`;

// motionSentence says how the plates move at a boundary.
export function motionSentence(m) {
  if (!m) return "How fast the plates move there is not known in this motion model.";
  const parts = [];
  if (m.opening_mm_yr !== null) {
    if (Math.abs(m.opening_mm_yr) < 0.05) parts.push("neither parting nor closing");
    else parts.push(`${m.opening_mm_yr > 0 ? "parting" : "closing"} at ${Math.abs(m.opening_mm_yr).toFixed(1)} mm/yr`);
  }
  if (m.shear_mm_yr !== null && Math.abs(m.shear_mm_yr) >= 0.05) {
    parts.push(`sliding ${m.shear_mm_yr > 0 ? "right" : "left"}-laterally at ${Math.abs(m.shear_mm_yr).toFixed(1)} mm/yr`);
  }
  const sigma = m.rate_sigma_mm_yr === null ? "" : ` ± ${m.rate_sigma_mm_yr.toFixed(1)}`;
  return `There the ${plateName(m.plate)} moves ${m.rate_mm_yr.toFixed(1)}${sigma} mm/yr towards the ${direction(m.azimuth_deg)} (${Math.round(m.azimuth_deg)}°) as seen from the ${plateName(m.relative_to)}${parts.length ? ": " + parts.join(", ") : ""}.`;
}

const kind = (type) => `${/^[aeiou]/.test(typeWords[type]) ? "an" : "a"} ${typeWords[type]}`;

function nearestSentence(b, lead) {
  if (b.distance_km === 0 || b.azimuth_deg === null) return `${lead} ${the(b.name)}, ${kind(b.type)}, on which it lies.`;
  return `${lead} ${the(b.name)}, ${kind(b.type)}, ${kmSigma(b.distance_km, b.distance_sigma_km)} to the ${direction(b.azimuth_deg)} (${Math.round(b.azimuth_deg)}°).`;
}

const confidence = {
  high: "confidence: no other label is met when every limit, distance and position is moved by one σ.",
  medium: "confidence: moved by one σ, other labels of the same family are met.",
  low: "confidence: moved by one σ, labels of another family are met.",
};

function boundaryRows(b) {
  const m = b.relative_motion;
  return [
    ["Type", b.type],
    ["Distance", num(b.distance_km, b.distance_sigma_km, "km")],
    ["Azimuth to it", num(b.azimuth_deg, null, "°")],
    ["Nearest point", words(b.nearest_point[0], b.nearest_point[1], 3)],
    ["Trend of the boundary", num(b.boundary_azimuth_deg, null, "°")],
    ["Plates, left and right", `${b.left_plate}, ${b.right_plate}${b.subducting_plate ? `; ${b.subducting_plate} goes down` : ""}`],
    ...(m ? [
      ["Rate", num(m.rate_mm_yr, m.rate_sigma_mm_yr, "mm/yr")],
      ["Azimuth of motion", num(m.azimuth_deg, m.azimuth_sigma_deg, "°")],
      ["Opening", num(m.opening_mm_yr, null, "mm/yr")],
      ["Shear, right-lateral", num(m.shear_mm_yr, null, "mm/yr")],
      ["Obliquity", num(m.obliquity_deg, null, "°")],
      ["Motion model", m.motion_model],
    ] : [["Relative motion", "not known"]]),
  ];
}

// table lays rows of name and value out.
export function table(caption, rows, head) {
  return el("table", {}, el("caption", { class: "away" }, caption),
    head ? el("thead", {}, el("tr", {}, head.map((h, i) => el("th", { scope: "col", class: i && "num" }, h)))) : null,
    el("tbody", {}, rows.map((r) => el("tr", {}, el("th", { scope: "row" }, r[0]), r.slice(1).map((c) => el("td", { class: "num" }, c))))));
}

// list writes a list under a heading, nothing where it is empty.
export function list(title, items) {
  return items.length ? [el("h3", {}, title), el("ul", {}, items.map((i) => el("li", {}, i)))] : [];
}

// command shows the line that gives the same answer.
export function command(text) {
  const pre = el("pre", { tabindex: "0", role: "region", "aria-label": "curl command" }, text);
  return [el("h3", {}, "The same by curl"), pre, copyButton(text, pre, "Copy the curl command")];
}

export const edition = (m) => el("p", { class: "sub" }, `Model ${m.id}@${m.edition}, sha256 ${m.sha256.slice(0, 12)}.`);

function slabSentence(s) {
  const parts = [`${s.name}: top at ${num(s.depth_km, s.sigma_km, "km")} depth, dipping ${Math.round(s.dip_deg)}° towards the ${direction(s.dip_azimuth_deg)}.`];
  const relation = { above: "The site lies above it", near_interface: "The site lies near the interface", within: "The site lies within the slab", below: "The site lies below its top" }[s.site_relation];
  if (relation) parts.push(`${relation}: ${num(s.clearance_km, null, "km")} above the top vertically, ${num(s.distance_3d_km, null, "km")} from it in space.`);
  return parts.join(" ");
}

// showAnswer fills the panel. query is that of /v1/point and of the figure; back leads
// to where the site was chosen, null for none.
export function showAnswer(panel, a, query, back) {
  const [name, gloss] = labelWords[a.setting.label] || [a.setting.label, ""];
  const near = a.nearest_boundary, control = a.controlling_boundary;
  const same = control && control.id === near.id;
  const side = a.plate.side_uncertain ? " (which side of the boundary is uncertain)" : "";
  const depth = a.site.depth_km === null ? "" : `, depth ${a.site.depth_km} km`;
  fill(
    panel,
    el("h2", {}, name),
    back,
    el("p", { class: "place" }, words(a.site.lon, a.site.lat) + depth),
    el("p", { class: "lead" }, `On the ${a.plate.name} plate${side}, ${gloss}.`),
    el("p", {}, nearestSentence(near, "The nearest plate boundary is"), " ", motionSentence(near.relative_motion)),
    control === null ? el("p", {}, "No boundary decides the setting.")
      : same ? el("p", {}, "The same boundary decides the setting.")
        : el("p", {}, nearestSentence(control, "The setting is decided by"), " ", motionSentence(control.relative_motion)),
    el("p", {}, el("span", { class: "conf" }, a.setting.confidence), " ", confidence[a.setting.confidence]),
    ...list("Reasons", a.setting.reasons),
    ...list("It could also be", a.setting.alternatives.map((x) => `${labelName(x.label)} (${x.family}): ${x.reason}`)),
    ...list("Cautions", a.notes.map((n) => n.detail)),
    ...list("Slabs below", a.slabs.map(slabSentence)),
    ...section(a, query),
    el("h3", {}, `Nearest boundary: ${near.name}`), table("Nearest boundary", boundaryRows(near)),
    ...(control && !same ? [el("h3", {}, `Controlling boundary: ${control.name}`), table("Controlling boundary", boundaryRows(control))] : []),
    ...list("Also near", [
      ...a.nearby_boundaries.map((b) => `${b.name}, ${typeWords[b.type]}, ${km(b.distance_km)} km to the ${direction(b.azimuth_deg)}`),
      a.triple_junction && `Triple junction ${a.triple_junction.plates.join("-")}, ${km(a.triple_junction.distance_km)} km`,
      a.diffuse_zone && `Inside the zone ${a.diffuse_zone.name} (${a.diffuse_zone.kind})`,
      a.hotspot && `Hotspot ${a.hotspot.name}, ${km(a.hotspot.distance_km)} km`,
    ].filter(Boolean)),
    ...command(curl(`v1/point?${query}`)),
    edition(a.model),
  );
  panel.scrollTop = 0;
}

let saved = ""; // the address of the figure that can be saved

// section shows the figure of the slab below. It is fetched, so that it comes with the
// token, and stands in a tree of its own, so that its styles need no exception from the
// page's policy and touch nothing else.
function section(a, query) {
  if (!a.slabs.length) return [];
  const s = a.slabs[0];
  const drawing = el("div", { role: "img", "aria-label": `Cross-section of ${s.name} through the site: its top lies at ${num(s.depth_km, s.sigma_km, "km")} below the site.` });
  const figure = el("figure", { tabindex: "0", role: "region", "aria-label": "Slab section" }, drawing);
  const parts = [el("h3", {}, "Slab section"), figure, el("p", {}, el("a", { download: "section.svg" }, "Save the figure"))];
  const path = `v1/section.svg?${query}`;
  const load = async () => {
    try {
      const svg = await ask(path);
      if (!figure.isConnected) return;
      draw(drawing, svg);
      URL.revokeObjectURL(saved);
      saved = URL.createObjectURL(new Blob([svg], { type: "image/svg+xml" }));
      parts[2].firstChild.href = saved;
    } catch (e) {
      if (e instanceof HeldError) later("section", load);
      else for (const p of parts) p.remove();
    }
  };
  load();
  return parts;
}

// draw puts a figure into a tree of its own. Its styles are taken out of the text, since
// a browser refuses them where it parses them.
function draw(host, text) {
  const sheet = new CSSStyleSheet(), tree = host.shadowRoot || host.attachShadow({ mode: "open" });
  let rules = "svg { display: block; width: 100%; min-width: 34rem; height: auto; } ";
  const bare = text.replace(/<style[^>]*>([^<]*)<\/style>/g, (_, css) => { rules += css; return ""; });
  sheet.replaceSync(rules);
  tree.adoptedStyleSheets = [sheet];
  tree.replaceChildren(document.importNode(new DOMParser().parseFromString(bare, "image/svg+xml").documentElement, true));
}
