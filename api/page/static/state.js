// The page's state is in the fragment of its address:
//   #site=lon,lat&depth_km=&motion=&shape=…&file=&sites=…&view=lon,lat,zoom&projection=flat&layers=a,b
// shape is an area and sites the places of a file, packed (codec.js); area=lon,lat;lon,lat;…
// is read as well, for links written by hand. What does not fit into a link stays in the
// history of the tab, so that going back and reloading keep it.
import { packArea, packSites, unpackArea, unpackSites } from "./codec.js";

const layerNames = ["plates", "boundaries", "slabs", "zones", "hotspots"];

// linkHolds is how many characters of an area or of sites a link takes: mail and chat
// programs cut longer links.
export const linkHolds = 6000;

const tabHolds = 1 << 20; // characters that the history of the tab takes

export const defaults = () => ({
  site: null, depth: "", motion: "", area: null, sites: null,
  view: { lon: -30, lat: 15, zoom: 1 }, flat: false,
  layers: new Set(["plates", "boundaries"]),
});

// areaOf and sitesOf make the state of an area and of a file's sites: they pack once.
export const areaOf = (geometry) => ({ geometry, packed: packArea(geometry) });

export const sitesOf = (name, list) => ({ name, count: list.length, packed: packSites(list, true), bare: packSites(list, false) });

const numbers = (text, n) => {
  const v = text.split(",").map(Number);
  return v.length === n && v.every(Number.isFinite) ? v : null;
};

const place = (v) => v && v[0] >= -180 && v[0] <= 360 && Math.abs(v[1]) <= 90;

function readArea(q, kept) {
  const packed = q.get("shape") || kept?.shape;
  if (packed) {
    const geometry = unpackArea(packed);
    return geometry && { geometry, packed };
  }
  const ring = (q.get("area") || "").split(";").map((p) => numbers(p, 2));
  return ring.length >= 3 && ring.every(place) ? areaOf({ type: "Polygon", coordinates: [[...ring, ring[0]]] }) : null;
}

function readSites(q, kept) {
  const list = unpackSites(kept?.sites || q.get("sites") || "");
  return list && { ...sitesOf((q.get("file") || "sites").slice(0, 80), list), list };
}

// read returns the state of a fragment and of what the tab kept with it.
export function read(fragment, kept) {
  const q = new URLSearchParams(fragment.replace(/^#/, ""));
  const s = defaults();
  const site = numbers(q.get("site") || "", 2);
  if (place(site)) s.site = { lon: site[0], lat: site[1] };
  if (Number.isFinite(Number(q.get("depth_km") || NaN))) s.depth = q.get("depth_km");
  s.motion = q.get("motion") || "";
  const view = numbers(q.get("view") || "", 3);
  if (s.site) s.view = { ...s.site, zoom: 6 }; // for links written by hand
  if (place(view)) s.view = { lon: view[0], lat: view[1], zoom: Math.min(Math.max(view[2], 0.6), 80) };
  s.flat = q.get("projection") === "flat";
  if (q.has("layers")) s.layers = new Set(q.get("layers").split(",").filter((l) => layerNames.includes(l)));
  s.area = readArea(q, kept);
  s.sites = readSites(q, kept);
  return s;
}

// fitted tells how sites go into a link: with names, without, or not at all.
function fitted(sites, room) {
  return [sites.packed, sites.bare].find((t) => t.length <= room) || null;
}

// write returns the fragment of a state, what the tab is to keep beside it, and what a
// link lacks, in words, "" where it holds all.
export function write(s) {
  const parts = [], kept = {};
  let lacks = "", room = linkHolds;
  if (s.site) parts.push(`site=${s.site.lon},${s.site.lat}`);
  if (s.depth !== "") parts.push(`depth_km=${encodeURIComponent(s.depth)}`);
  if (s.motion) parts.push(`motion=${encodeURIComponent(s.motion)}`);
  if (s.area && s.area.packed.length <= room) {
    parts.push(`shape=${s.area.packed}`);
    room -= s.area.packed.length;
  } else if (s.area) {
    lacks = `The link holds the view, not this area: its outline takes ${s.area.packed.length.toLocaleString("en")} characters, and a link holds ${linkHolds.toLocaleString("en")}.`;
    if (s.area.packed.length <= tabHolds) kept.shape = s.area.packed;
  }
  if (s.sites) {
    const text = fitted(s.sites, room);
    parts.push(`file=${encodeURIComponent(s.sites.name)}`);
    if (text) parts.push(`sites=${text}`);
    if (text !== s.sites.packed) {
      lacks = text ? "The link holds the places of the sites, not their names: those would make it too long."
        : `The link holds the view, not the file: its ${s.sites.count.toLocaleString("en")} sites take ${s.sites.bare.length.toLocaleString("en")} characters, and a link holds ${linkHolds.toLocaleString("en")}.`;
      if (s.sites.packed.length <= tabHolds) kept.sites = s.sites.packed;
    }
  }
  parts.push(`view=${s.view.lon.toFixed(2)},${s.view.lat.toFixed(2)},${s.view.zoom.toFixed(2)}`);
  if (s.flat) parts.push("projection=flat");
  parts.push(`layers=${layerNames.filter((l) => s.layers.has(l)).join(",")}`);
  return { hash: "#" + parts.join("&"), kept, lacks };
}
