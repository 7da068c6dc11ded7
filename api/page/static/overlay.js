// What an answer adds to the map: the site, the lines to the boundaries, the velocity
// with its uncertainty, sites from a file, an area.
import { siteColour, siteShape } from "./symbols.js";

const rad = Math.PI / 180;

// toward returns the place at an azimuth and an angle, both in degrees, from another.
function toward([lon, lat], azimuth, angle) {
  const a = azimuth * rad, d = angle * rad, f = lat * rad;
  const g = Math.asin(Math.sin(f) * Math.cos(d) + Math.cos(f) * Math.sin(d) * Math.cos(a));
  const l = Math.atan2(Math.sin(a) * Math.sin(d) * Math.cos(f), Math.cos(d) - Math.sin(f) * Math.sin(g));
  return [lon + l / rad, g / rad];
}

export function drawAnswer(globe, projection, path) {
  const { ctx, p, k, shown } = globe;
  const line = (geo, colour, width, dash = []) => {
    for (const [c, w] of [[p.halo, width + 2.6], [colour, width]]) {
      ctx.setLineDash(c === p.halo ? [] : dash.map((d) => d * k));
      ctx.strokeStyle = c;
      ctx.lineWidth = w * k;
      ctx.beginPath();
      path(geo);
      ctx.stroke();
    }
    ctx.setLineDash([]);
  };
  if (shown.area) {
    ctx.beginPath();
    path(shown.area);
    ctx.globalAlpha = 0.14;
    ctx.fillStyle = p.mark;
    ctx.fill();
    ctx.globalAlpha = 1;
    line(shown.area, p.mark, 2);
  }
  if (shown.draft.length) {
    line({ type: "LineString", coordinates: shown.draft }, p.mark, 2, [6, 4]);
    for (const at of shown.draft) dot(globe, at, 4, p.mark);
  }
  drawSites(globe);
  if (shown.wanted) dot(globe, shown.wanted, 7, p.halo, p.soft, 2);
  const a = shown.answer;
  if (!a) return;
  const site = [a.site.lon, a.site.lat];
  const same = a.controlling_boundary && a.controlling_boundary.id === a.nearest_boundary.id;
  if (a.controlling_boundary && !same) line({ type: "LineString", coordinates: [site, a.controlling_boundary.nearest_point] }, p.mark, 1.8, [7, 4]);
  line({ type: "LineString", coordinates: [site, a.nearest_boundary.nearest_point] }, p.mark, 1.8);
  velocity(globe, a.nearest_boundary);
  if (a.controlling_boundary && !same) velocity(globe, a.controlling_boundary);
  dot(globe, site, 7, p.halo, p.mark, 3);
  dot(globe, site, 2, p.mark);
}

function dot(globe, at, r, fill, ring, width) {
  const xy = globe.project(at), { ctx, k } = globe;
  if (!xy) return;
  ctx.beginPath();
  ctx.arc(xy[0], xy[1], r * k, 0, 7);
  ctx.fillStyle = fill;
  ctx.fill();
  if (!ring) return;
  ctx.strokeStyle = ring;
  ctx.lineWidth = width * k;
  ctx.stroke();
}

// velocity draws the motion of the plate across a boundary, seen from the site's
// plate: an arrow, and at its tip 1σ: the half-axis along it is σ of the rate, that
// across it σ of the azimuth; a bar where the latter is not known. Where they would be too
// small to see they are drawn larger, and the label says by how much.
function velocity(globe, b) {
  const m = b.relative_motion, { ctx, p, k } = globe;
  if (!m) return;
  const from = globe.project(b.nearest_point), ahead = globe.project(toward(b.nearest_point, m.azimuth_deg, 0.2));
  if (!from || !ahead) return;
  const angle = Math.atan2(ahead[1] - from[1], ahead[0] - from[0]);
  const px = 1.3 * k, len = m.rate_mm_yr * px; // px to the mm/yr
  const shaft = new Path2D(), head = new Path2D(), size = Math.min(9 * k, len * 0.6);
  shaft.moveTo(0, 0);
  shaft.lineTo(Math.max(len - size * 0.7, 0), 0);
  head.moveTo(len, 0);
  head.lineTo(len - size, -size * 0.5);
  head.lineTo(len - size, size * 0.5);
  head.closePath();
  const error = new Path2D();
  let along = (m.rate_sigma_mm_yr || 0) * px, across = m.azimuth_sigma_deg === null ? null : m.rate_mm_yr * m.azimuth_sigma_deg * rad * px;
  const most = Math.max(along, across || 0), larger = most > 0 ? [1, 2, 5, 10, 20].find((f) => f * most >= 3 * k) || 50 : 1;
  along *= larger;
  if (across !== null) {
    across *= larger;
    error.ellipse(len, 0, along, across, 0, 0, 2 * Math.PI);
  } else if (along) {
    for (const x of [len - along, len + along]) { error.moveTo(x, -4 * k); error.lineTo(x, 4 * k); }
    error.moveTo(len - along, 0);
    error.lineTo(len + along, 0);
  }
  ctx.save();
  ctx.translate(from[0], from[1]);
  ctx.rotate(angle);
  for (const [colour, extra] of [[p.halo, 3], [p.ink, 0]]) {
    ctx.strokeStyle = ctx.fillStyle = colour;
    ctx.lineWidth = (2.4 + extra) * k;
    ctx.stroke(shaft);
    if (extra) ctx.stroke(head);
    ctx.fill(head);
    ctx.lineWidth = (1.3 + extra) * k;
    ctx.stroke(error);
  }
  ctx.restore();
  const words = `${m.rate_mm_yr.toFixed(m.rate_sigma_mm_yr === null ? 0 : 1)}${m.rate_sigma_mm_yr === null ? "" : " ± " + m.rate_sigma_mm_yr.toFixed(1)} mm/yr${larger > 1 ? `, σ drawn ×${larger}` : ""}`;
  const half = words.length * 3.6 * k, off = len + along + 8 * k; // from the tip, so that the words stand clear of it
  globe.text(words, from[0] + Math.cos(angle) * (off + half * Math.abs(Math.cos(angle))), from[1] + Math.sin(angle) * (off + half * Math.abs(Math.cos(angle)) + 4 * k), 12, p.ink, "600");
}

function drawSites(globe) {
  const { ctx, p, k, shown } = globe;
  for (const s of shown.sites) {
    const xy = s.geometry ? null : globe.project([s.lon, s.lat]);
    s.xy = xy;
    if (!xy || xy[0] < -20 || xy[1] < -20 || xy[0] > globe.w + 20 || xy[1] > globe.h + 20) continue;
    ctx.save();
    ctx.translate(xy[0], xy[1]);
    ctx.scale(k, k);
    const path = new Path2D(siteShape(s.label));
    ctx.lineWidth = 2.4;
    ctx.strokeStyle = p.halo;
    ctx.stroke(path);
    ctx.fillStyle = siteColour(s.family, p.dark);
    ctx.fill(path);
    if (s.confidence === "low") { // open markers are uncertain
      ctx.fillStyle = p.halo;
      ctx.scale(0.55, 0.55);
      ctx.fill(path);
    }
    ctx.restore();
  }
}
