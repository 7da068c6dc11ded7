// The page's state is in the fragment of its address:
//   #site=lon,lat&depth_km=&motion=&view=lon,lat,zoom&projection=flat&layers=a,b&area=lon,lat;...
const layerNames = ["plates", "boundaries", "slabs", "zones", "hotspots"];

export const defaults = () => ({
  site: null, depth: "", motion: "", area: null,
  view: { lon: -30, lat: 15, zoom: 1 }, flat: false,
  layers: new Set(["plates", "boundaries"]),
});

const numbers = (text, n) => {
  const v = text.split(",").map(Number);
  return v.length === n && v.every(Number.isFinite) ? v : null;
};

const place = (v) => v && v[0] >= -180 && v[0] <= 360 && Math.abs(v[1]) <= 90;

export function read(fragment) {
  const q = new URLSearchParams(fragment.replace(/^#/, ""));
  const s = defaults();
  const site = numbers(q.get("site") || "", 2);
  if (place(site)) s.site = { lon: site[0], lat: site[1] };
  if (Number.isFinite(Number(q.get("depth_km") || NaN))) s.depth = q.get("depth_km");
  s.motion = q.get("motion") || "";
  const view = numbers(q.get("view") || "", 3);
  if (place(view)) s.view = { lon: view[0], lat: view[1], zoom: Math.min(Math.max(view[2], 0.6), 80) };
  s.flat = q.get("projection") === "flat";
  if (q.has("layers")) s.layers = new Set(q.get("layers").split(",").filter((l) => layerNames.includes(l)));
  const area = (q.get("area") || "").split(";").map((p) => numbers(p, 2));
  if (area.length >= 3 && area.every(place)) s.area = area;
  return s;
}

export function write(s) {
  const parts = [];
  if (s.site) parts.push(`site=${s.site.lon},${s.site.lat}`);
  if (s.depth !== "") parts.push(`depth_km=${encodeURIComponent(s.depth)}`);
  if (s.motion) parts.push(`motion=${encodeURIComponent(s.motion)}`);
  if (s.area) parts.push(`area=${s.area.map((p) => p.join(",")).join(";")}`);
  parts.push(`view=${s.view.lon.toFixed(2)},${s.view.lat.toFixed(2)},${s.view.zoom.toFixed(2)}`);
  if (s.flat) parts.push("projection=flat");
  parts.push(`layers=${layerNames.filter((l) => s.layers.has(l)).join(",")}`);
  return "#" + parts.join("&");
}
