// The answer for an area, in plain language and in numbers.
import { el, fill } from "./dom.js";
import { command, edition, km, labelName, list, num, table } from "./answer.js";
import { curl } from "./service.js";
import { typeWords } from "./symbols.js";

const percent = (f) => `${(f * 100).toFixed(1)} %`;

const span = (r, unit) => (r === null ? "not known" : `${r.min.toFixed(1)} to ${r.max.toFixed(1)} ${unit}`.replace(/-/g, "\u2212"));

const longest = 1500; // characters of an outline in a command

// showArea fills the panel. name is that of the file it came from, "" if it was drawn.
export function showArea(panel, a, polygon, name, notes) {
  const top = a.settings[0], plates = a.plates.map((p) => `${p.name} (${percent(p.fraction)})`);
  const near = a.nearest_boundary, s = a.sampling;
  const text = JSON.stringify(polygon), data = text.length > longest ? `@${name || "area.geojson"}` : text;
  fill(
    panel,
    el("h2", {}, "Area"),
    name ? el("p", { class: "place" }, name) : null,
    el("p", { class: "lead" }, `${Math.round(a.area_km2).toLocaleString("en")} km² on ${plates.length === 1 ? "the plate" : "the plates"} ${plates.join(", ")}.`),
    el("p", {}, top ? `The largest part is ${labelName(top.label).toLowerCase()} (${percent(top.fraction)}). ` : "",
      a.boundaries_inside.length ? `${a.boundaries_inside.length} plate ${a.boundaries_inside.length === 1 ? "boundary runs" : "boundaries run"} through it.`
        : `No plate boundary runs through it; the nearest is the ${near.name}, ${km(near.distance_km)} km away.`),
    notes.filter(Boolean).map((n) => el("p", { class: "sub" }, n)),
    el("h3", {}, "Settings"),
    table("Shares of settings", a.settings.map((x) => [labelName(x.label), x.family, percent(x.fraction)]), ["Setting", "Family", "Share"]),
    ...(a.boundaries_inside.length ? [el("h3", {}, "Boundaries inside"),
      table("Boundaries inside", a.boundaries_inside.map((b) => [`${b.name} (${typeWords[b.type]}, ${b.left_plate} | ${b.right_plate})`, `${km(b.length_km)} km`,
        b.relative_motion ? span(b.relative_motion.rate_mm_yr, "mm/yr") : "not known"]), ["Boundary", "Length", "Rate"])] : []),
    ...(a.slabs.length ? [el("h3", {}, "Slabs below"),
      table("Slabs below", a.slabs.map((x) => [x.name, percent(x.fraction), `${Math.round(x.min_depth_km)} to ${Math.round(x.max_depth_km)} km`]), ["Slab", "Share", "Depth of its top"])] : []),
    ...list("Cautions", a.notes.map((n) => n.detail)),
    el("p", { class: "sub" }, `Shares of settings from ${s.points} points, 1σ ${percent(s.standard_error)}; of plates from ${s.plate_points} points, 1σ ${percent(s.plate_standard_error)}.`),
    ...command(curl("v1/area", "-H", "Content-Type: application/geo+json", data === text ? "-d" : "--data-binary", data)),
    edition(a.model),
  );
  panel.scrollTop = 0;
}
