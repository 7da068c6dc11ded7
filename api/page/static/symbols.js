// How boundary types, settings and layers look. Types differ by pattern as well as by
// colour: ridges are double lines, rifts broken double lines, trenches carry teeth on
// the upper plate, convergence carries ticks, transforms are single lines.
const css = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

// palette reads the colours of the theme that is on.
export function palette() {
  const p = {};
  for (const n of ["paper", "ink", "soft", "sea", "land", "coast", "grat", "halo", "subduction", "ridge", "transform", "convergence", "rift", "slab", "zone", "hot", "mark"]) p[n] = css("--" + n);
  p.dark = matchMedia("(prefers-color-scheme: dark)").matches;
  return p;
}

export const types = {
  subduction: { name: "Subduction (teeth on the upper plate)", colour: "subduction", width: 2.2, mark: "teeth" },
  spreading_ridge: { name: "Spreading ridge", colour: "ridge", width: 3.6, core: 1.3 },
  continental_rift: { name: "Continental rift", colour: "rift", width: 3.8, core: 1.3, dash: [7, 4] },
  oceanic_transform: { name: "Oceanic transform", colour: "transform", width: 1.3 },
  continental_transform: { name: "Continental transform", colour: "transform", width: 2.2, dash: [10, 3, 2, 3] },
  oceanic_convergence: { name: "Oceanic convergence", colour: "convergence", width: 1.8, dash: [6, 3], mark: "ticks" },
  continental_convergence: { name: "Continental convergence", colour: "convergence", width: 2.2, mark: "ticks" },
};

export const typeWords = {
  subduction: "subduction zone", spreading_ridge: "spreading ridge", continental_rift: "continental rift",
  oceanic_transform: "oceanic transform", continental_transform: "continental transform",
  oceanic_convergence: "oceanic convergence", continental_convergence: "continental convergence",
};

// Settings: colour by family, shape by label.
const families = {
  subduction: ["#0a5a99", "#7cc0f7"], spreading: ["#c2510c", "#f59a63"], rift: ["#8a5a00", "#e8bf5e"],
  transform: ["#00694f", "#58cbaa"], collision: ["#6b2f94", "#d2adee"], convergence: ["#a3276b", "#f5a3cd"],
  interior: ["#4c5765", "#c3ccd4"],
};

const shapes = {
  trench: "symbolTriangle", outer_rise: "symbolDiamond", forearc: "symbolCircle", volcanic_arc: "symbolStar", back_arc: "symbolSquare",
  back_arc_spreading: "symbolDiamond", ridge_axis: "symbolCircle", ridge_flank: "symbolSquare",
  transform_zone: "symbolWye", continental_rift: "symbolTriangle", collision_zone: "symbolCross", convergent_margin: "symbolStar",
  deforming_zone: "symbolDiamond", plate_interior: "symbolCircle",
};

export const siteColour = (family, dark) => (families[family] || families.interior)[dark ? 1 : 0];

const paths = new Map();

// siteShape returns the path data of a label's marker, about 16 px across.
export function siteShape(label) {
  if (!paths.has(label)) paths.set(label, d3.symbol(d3[shapes[label] || "symbolCircle"], 90)());
  return paths.get(label);
}

export const labelWords = {
  trench: ["Trench", "at the line where one plate goes down below another"],
  outer_rise: ["Outer rise", "on the plate that is about to go down, seaward of the trench"],
  forearc: ["Forearc", "between a trench and its volcanic arc"],
  volcanic_arc: ["Volcanic arc", "where the slab below is deep enough to feed volcanoes"],
  back_arc: ["Back-arc", "behind the volcanic arc of a subduction zone"],
  back_arc_spreading: ["Back-arc spreading", "where the plate above a slab is torn apart"],
  ridge_axis: ["Ridge axis", "where two plates part and sea floor is made"],
  ridge_flank: ["Ridge flank", "on young sea floor beside a spreading ridge"],
  transform_zone: ["Transform zone", "where two plates slide past each other"],
  continental_rift: ["Continental rift", "where a continent is being stretched apart"],
  collision_zone: ["Collision zone", "where two continents are pressed together"],
  convergent_margin: ["Convergent margin", "where plates close without a known slab"],
  deforming_zone: ["Deforming zone", "in a belt where the motion between plates is spread over a width"],
  plate_interior: ["Plate interior", "away from plate boundaries; earthquakes are possible all the same"],
};

// strokeLines draws screen lines in the manner of a type. Each line is an array of
// [x, y]; upper is +1 where the upper plate is on the left of the lines, else -1.
export function strokeLines(ctx, list, look, p, k, upper) {
  const path = new Path2D();
  for (const l of list) l.forEach(([x, y], i) => (i ? path.lineTo(x, y) : path.moveTo(x, y)));
  ctx.lineJoin = "round";
  ctx.lineCap = "butt";
  ctx.setLineDash((look.dash || []).map((d) => d * k));
  ctx.strokeStyle = p[look.colour];
  ctx.lineWidth = look.width * k;
  ctx.stroke(path);
  ctx.setLineDash([]);
  if (look.core) {
    ctx.strokeStyle = p.halo;
    ctx.lineWidth = look.core * k;
    ctx.stroke(path);
  }
  if (look.mark) {
    ctx.fillStyle = p[look.colour];
    for (const l of list) along(l, (look.mark === "teeth" ? 15 : 11) * k, (x, y, tx, ty) => mark(ctx, look.mark, x, y, tx, ty, k, upper));
  }
}

// along visits points at equal steps along a screen line, with the unit tangent.
function along(line, step, f) {
  let left = step / 2;
  for (let i = 1; i < line.length; i++) {
    const [x0, y0] = line[i - 1], [x1, y1] = line[i];
    const len = Math.hypot(x1 - x0, y1 - y0);
    if (len === 0) continue;
    const tx = (x1 - x0) / len, ty = (y1 - y0) / len;
    let at = left;
    for (; at <= len; at += step) f(x0 + tx * at, y0 + ty * at, tx, ty);
    left = at - len;
  }
}

function mark(ctx, kind, x, y, tx, ty, k, upper) {
  const nx = ty * upper, ny = -tx * upper; // towards the upper plate
  ctx.beginPath();
  if (kind === "teeth") {
    const h = 6.5 * k, w = 3.8 * k;
    ctx.moveTo(x - tx * w, y - ty * w);
    ctx.lineTo(x + nx * h, y + ny * h);
    ctx.lineTo(x + tx * w, y + ty * w);
    ctx.fill();
    return;
  }
  ctx.lineWidth = 1.4 * k;
  ctx.moveTo(x - nx * 3.6 * k, y - ny * 3.6 * k);
  ctx.lineTo(x + nx * 3.6 * k, y + ny * 3.6 * k);
  ctx.stroke();
}
