// The map itself: a globe, or a flat map in the Equal Earth projection, on a canvas.
import { palette, types, strokeLines } from "./symbols.js";
import { drawAnswer } from "./overlay.js";

const graticule = d3.geoGraticule10();
const zoomMost = 80, zoomLeast = 0.6;

export class Globe {
  constructor(canvas) {
    this.canvas = canvas;
    this.ctx = canvas.getContext("2d");
    this.view = { lon: 0, lat: 0, zoom: 1 };
    this.flat = false;
    this.layers = new Set();
    this.data = { land: null, fine: null, boundaries: [], plates: [], slabs: null, zones: null, hotspots: null };
    this.shown = { answer: null, wanted: null, area: null, draft: [], sites: [] };
    this.cross = false;
    this.onmove = () => {};
    this.p = palette();
    matchMedia("(prefers-color-scheme: dark)").addEventListener("change", () => { this.p = palette(); this.redraw(); });
    new ResizeObserver(() => this.resize()).observe(canvas);
    this.resize();
  }

  resize() {
    const r = this.canvas.getBoundingClientRect(), dpr = window.devicePixelRatio || 1;
    this.w = Math.max(r.width, 1);
    this.h = Math.max(r.height, 1);
    this.canvas.width = Math.round(this.w * dpr);
    this.canvas.height = Math.round(this.h * dpr);
    this.dpr = dpr;
    this.k = Math.min(Math.max(Math.min(this.w, this.h) / 900, 0.8), 2);
    this.draw(); // at once: the new size has emptied the canvas
  }

  // projection builds the projection of the view.
  projection() {
    const { lon, lat, zoom } = this.view, { w, h } = this;
    const p = this.flat
      ? d3.geoEqualEarth().rotate([-lon, 0]).scale(Math.min(w / 5.5, h / 2.7) * zoom)
      : d3.geoOrthographic().rotate([-lon, -lat]).scale(Math.min(w, h) * 0.46 * zoom).clipAngle(90);
    p.translate([w / 2, h / 2]);
    if (this.flat) p.center([0, zoom <= 1 ? 0 : lat]);
    return p.precision(0.5).clipExtent([[-20, -20], [w + 20, h + 20]]);
  }

  // zoomFor returns the zoom at which places within a distance of the middle, in radians,
  // fill the map.
  zoomFor(reach) {
    if (!this.flat) return 1 / Math.max(Math.sin(Math.min(reach, Math.PI / 2)), 0.01);
    return (0.46 * Math.min(this.w, this.h)) / Math.min(this.w / 5.5, this.h / 2.7) / Math.max(reach, 0.01);
  }

  project(at) {
    const p = this.projection();
    if (!this.flat && d3.geoDistance(at, [this.view.lon, this.view.lat]) > Math.PI / 2) return null;
    return p(at);
  }

  invert(x, y) {
    const at = this.projection().invert([x, y]);
    if (!at || !at.every(Number.isFinite) || Math.abs(at[1]) > 90) return null;
    const back = this.projection()(at); // off the globe's edge there is no place
    return back && Math.hypot(back[0] - x, back[1] - y) < 1 ? [((at[0] + 540) % 360) - 180, at[1]] : null;
  }

  // look moves the view.
  look({ lon = this.view.lon, lat = this.view.lat, zoom = this.view.zoom }) {
    this.view = { lon: ((lon + 540) % 360) - 180, lat: Math.max(-90, Math.min(90, lat)), zoom: Math.max(zoomLeast, Math.min(zoomMost, zoom)) };
    this.onmove();
    this.redraw();
  }

  // pan moves by pixels.
  pan(dx, dy) {
    const deg = 180 / Math.PI / this.projection().scale();
    const stretch = Math.max(0.25, Math.cos((this.view.lat * Math.PI) / 180));
    this.look({ lon: this.view.lon - (dx * deg) / (this.flat ? 1 : stretch), lat: this.view.lat + dy * deg });
  }

  zoomBy(f, x = this.w / 2, y = this.h / 2) {
    const before = this.invert(x, y);
    this.look({ zoom: this.view.zoom * f });
    const after = before && this.invert(x, y);
    if (after) this.look({ lon: this.view.lon + before[0] - after[0], lat: this.view.lat + before[1] - after[1] });
  }

  redraw() {
    if (this.due) return;
    this.due = requestAnimationFrame(() => { this.due = 0; this.draw(); });
  }

  draw() {
    const { ctx, p, w, h, k, data, layers } = this;
    const projection = this.projection(), path = d3.geoPath(projection, ctx);
    ctx.setTransform(this.dpr, 0, 0, this.dpr, 0, 0);
    ctx.fillStyle = p.paper;
    ctx.fillRect(0, 0, w, h);
    const fill = (geo, colour, alpha = 1) => { ctx.globalAlpha = alpha; ctx.fillStyle = colour; ctx.beginPath(); path(geo); ctx.fill(); ctx.globalAlpha = 1; };
    const stroke = (geo, colour, width, dash = []) => { ctx.setLineDash(dash); ctx.strokeStyle = colour; ctx.lineWidth = width; ctx.beginPath(); path(geo); ctx.stroke(); ctx.setLineDash([]); };
    fill({ type: "Sphere" }, p.sea);
    const land = (this.view.zoom > 2.5 && data.fine) || data.land;
    if (land) { fill(land, p.land); stroke(land, p.coast, 0.6 * k); }
    stroke(graticule, p.grat, 0.6 * k);
    if (layers.has("plates")) this.drawPlates(fill);
    if (layers.has("zones") && data.zones) {
      const hatch = this.hatch();
      for (const f of data.zones) { fill(f, hatch, 0.55); stroke(f.outline, p.zone, 0.9 * k, [2 * k, 2 * k]); }
    }
    if (layers.has("slabs") && data.slabs) for (const f of data.slabs) stroke(f, p.slab, (f.properties.depth_km % 100 === 0 ? 1.3 : 0.7) * k);
    if (layers.has("boundaries")) this.drawBoundaries(projection);
    if (layers.has("slabs") && data.slabs && this.view.zoom > 4) this.labelContours();
    if (layers.has("plates")) this.labelPlates();
    if (layers.has("hotspots") && data.hotspots) this.drawHotspots();
    stroke({ type: "Sphere" }, p.ink, 1.2 * k);
    drawAnswer(this, projection, path);
    this.drawScale();
    if (this.cross) this.drawCross();
  }

  // drawScale draws a bar that is true at the middle of the view.
  drawScale() {
    const { ctx, k, w, h, p } = this, perKm = this.projection().scale() / 6371;
    const km = [5000, 2000, 1000, 500, 200, 100, 50, 20, 10, 5].find((s) => s * perKm < 150 * k) || 2;
    const x = w - 14 * k, y = h - 16 * k, len = km * perKm;
    for (const [colour, width] of [[p.halo, 5], [p.ink, 1.8]]) {
      ctx.strokeStyle = colour;
      ctx.lineWidth = width * k;
      ctx.beginPath();
      ctx.moveTo(x - len, y - 5 * k);
      ctx.lineTo(x - len, y);
      ctx.lineTo(x, y);
      ctx.lineTo(x, y - 5 * k);
      ctx.stroke();
    }
    this.text(`${km.toLocaleString("en")} km`, x - len / 2, y - 10 * k, 11, p.ink);
  }

  drawPlates(fill) {
    const tints = this.p.dark ? ["#7cc0f7", "#e8bf5e", "#58cbaa", "#d2adee", "#f59a63"] : ["#0a4a86", "#b08a00", "#00694f", "#6b2f94", "#b8420b"];
    const own = this.shown.answer?.plate.code;
    this.data.plates.forEach((f, i) => {
      if (f.properties.code === own) fill(f, this.p.mark, 0.08);
      else fill(f, tints[i % tints.length], 0.07);
    });
  }

  drawBoundaries(projection) {
    const groups = new Map();
    for (const f of this.data.boundaries) {
      const q = f.properties, upper = q.subducting_plate && q.subducting_plate === q.left_plate ? -1 : 1;
      const id = `${q.type} ${upper}`;
      if (!groups.has(id)) groups.set(id, { type: q.type, upper, lines: [] });
      groups.get(id).lines.push(...screenLines(projection, f));
    }
    const order = Object.keys(types).reverse();
    for (const g of [...groups.values()].sort((a, b) => order.indexOf(a.type) - order.indexOf(b.type))) {
      if (types[g.type]) strokeLines(this.ctx, g.lines, types[g.type], this.p, this.k * (this.view.zoom < 1.5 ? 0.75 : 1), g.upper);
    }
  }

  text(s, x, y, size, colour, style = "") {
    const { ctx, k, p } = this;
    ctx.font = `${style} ${size * k}px "Source Sans 3","Noto Sans","DejaVu Sans",sans-serif`;
    ctx.textAlign = "center";
    ctx.textBaseline = "middle";
    ctx.lineJoin = "round";
    ctx.lineWidth = 3.5 * k;
    ctx.strokeStyle = p.halo;
    ctx.strokeText(s, x, y);
    ctx.fillStyle = colour;
    ctx.fillText(s, x, y);
  }

  labelPlates() {
    const scale = this.projection().scale(), boxes = [];
    for (const f of this.data.plates) {
      const { at, sr, name } = f.properties;
      const across = Math.sqrt(sr) * scale, xy = at && across > 70 * this.k && this.project(at);
      if (!xy) continue;
      const half = name.length * 4.2 * this.k;
      if (xy[0] < half || xy[0] > this.w - half) continue; // it would be cut off
      if (boxes.some((b) => Math.abs(b.x - xy[0]) < b.half + half && Math.abs(b.y - xy[1]) < 16 * this.k)) continue;
      boxes.push({ x: xy[0], y: xy[1], half });
      this.text(name.toUpperCase(), xy[0], xy[1], 10.5, this.p.soft, "600");
    }
  }

  labelContours() {
    const used = [];
    for (const f of this.data.slabs) {
      const c = f.geometry.type === "LineString" ? f.geometry.coordinates : f.geometry.coordinates[0];
      const xy = this.project(c[Math.floor(c.length / 2)]);
      if (xy && xy[0] > 0 && xy[0] < this.w && xy[1] > 0 && xy[1] < this.h && used.every((u) => Math.hypot(u[0] - xy[0], (u[1] - xy[1]) * 1.6) > 24 * this.k)) {
        used.push(xy);
        this.text(`${f.properties.depth_km}`, xy[0], xy[1], 10, this.p.slab);
      }
    }
  }

  drawHotspots() {
    const { ctx, k, p } = this;
    for (const f of this.data.hotspots) {
      const xy = this.project(f.geometry.coordinates);
      if (!xy) continue;
      ctx.beginPath();
      ctx.arc(xy[0], xy[1], 3.2 * k, 0, 7);
      ctx.fillStyle = p.hot;
      ctx.strokeStyle = p.halo;
      ctx.lineWidth = 1.2 * k;
      ctx.fill();
      ctx.stroke();
      if (this.view.zoom > 3) this.text(f.properties.name, xy[0], xy[1] - 11 * k, 10, p.hot);
    }
  }

  drawCross() {
    const { ctx, k, w, h, p } = this, r = 14 * k;
    for (const [colour, width] of [[p.halo, 4.5 * k], [p.ink, 1.6 * k]]) {
      ctx.strokeStyle = colour;
      ctx.lineWidth = width;
      ctx.beginPath();
      for (const [dx, dy] of [[1, 0], [-1, 0], [0, 1], [0, -1]]) {
        ctx.moveTo(w / 2 + dx * 4 * k, h / 2 + dy * 4 * k);
        ctx.lineTo(w / 2 + dx * r, h / 2 + dy * r);
      }
      ctx.stroke();
    }
  }

  hatch() {
    const c = document.createElement("canvas");
    c.width = c.height = 8;
    const x = c.getContext("2d");
    x.strokeStyle = this.p.zone;
    x.beginPath();
    x.moveTo(-1, 9);
    x.lineTo(9, -1);
    x.stroke();
    return this.ctx.createPattern(c, "repeat");
  }
}

// screenLines returns a geometry's lines on the screen, as arrays of [x, y].
export function screenLines(projection, geo) {
  const out = [];
  const sink = { moveTo: (x, y) => out.push([[x, y]]), lineTo: (x, y) => out[out.length - 1].push([x, y]), closePath() {}, arc() {} };
  d3.geoPath(projection, sink)(geo);
  return out;
}
