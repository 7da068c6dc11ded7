// Plates as polygons, chained from the boundaries that they are on the one side of.

const key = ([lon, lat]) => `${(Math.abs(lon) === 180 ? 180 : lon).toFixed(5)},${lat.toFixed(5)}`;

// platePolygons returns a GeoJSON feature for each plate whose boundaries close. Rings
// run with the plate on their right, as d3 has it for polygons on the sphere.
export function platePolygons(boundaries, names) {
  const sides = new Map(); // plate: starts of lines by place
  for (const f of boundaries.features) {
    const parts = f.geometry.type === "LineString" ? [f.geometry.coordinates] : f.geometry.coordinates;
    for (const part of parts) {
      add(sides, f.properties.right_plate, part);
      add(sides, f.properties.left_plate, part.slice().reverse());
    }
  }
  const out = [];
  for (const [code, starts] of sides) {
    const rings = chain(starts);
    if (!rings.length) continue;
    const geometry = rings.length === 1 ? { type: "Polygon", coordinates: rings } : { type: "Polygon", coordinates: rings };
    out.push({ type: "Feature", properties: { code, name: names.get(code) || code, sr: d3.geoArea(geometry), at: label(geometry) }, geometry });
  }
  return out.sort((a, b) => b.properties.sr - a.properties.sr);
}

function add(sides, plate, line) {
  if (!sides.has(plate)) sides.set(plate, new Map());
  const starts = sides.get(plate), k = key(line[0]);
  starts.set(k, (starts.get(k) || []).concat([line]));
}

function chain(starts) {
  const rings = [];
  for (const k of [...starts.keys()]) {
    while (starts.get(k)?.length) {
      const ring = [];
      let at = k, line;
      while ((line = starts.get(at)?.pop())) {
        ring.push(...(ring.length ? line.slice(1) : line));
        at = key(line[line.length - 1]);
      }
      if (at === k && ring.length > 3) rings.push(ring);
    }
  }
  return rings;
}

// label returns a place well within a polygon for its name: of some hundred places
// around its middle, that farthest from its edge.
function label(geometry) {
  const [lon, lat] = d3.geoCentroid(geometry), reach = Math.min(80, Math.sqrt(d3.geoArea(geometry)) * 40);
  const edge = geometry.coordinates.flat().filter((_, i, all) => all.length < 400 || i % 3 === 0);
  let best = null, most = -1;
  for (let i = 0; i < 90; i++) {
    const r = reach * Math.sqrt(i / 90), a = i * 2.39996;
    const p = [lon + (r * Math.cos(a)) / Math.max(0.2, Math.cos((lat * Math.PI) / 180)), Math.max(-88, Math.min(88, lat + r * Math.sin(a)))];
    if (!d3.geoContains(geometry, p)) continue;
    let d = Infinity;
    for (const e of edge) d = Math.min(d, d3.geoDistance(p, e));
    if (d > most) [most, best] = [d, p];
  }
  return best;
}
