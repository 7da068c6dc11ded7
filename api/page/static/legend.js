// The legend's samples.
import { byId, el } from "./dom.js";
import { palette, strokeLines, types } from "./symbols.js";

function sample(name, draw) {
  const c = el("canvas", { width: 104, height: 36, "aria-hidden": "true" }), ctx = c.getContext("2d");
  ctx.scale(2, 2);
  draw(ctx);
  return el("li", {}, c, name);
}

export function drawLegend() {
  const p = palette();
  const line = (ctx, colour, width, dash = []) => {
    ctx.strokeStyle = colour;
    ctx.lineWidth = width;
    ctx.setLineDash(dash);
    ctx.beginPath();
    ctx.moveTo(2, 9);
    ctx.lineTo(50, 9);
    ctx.stroke();
    ctx.setLineDash([]);
  };
  byId("key").replaceChildren(
    ...Object.values(types).map((look) => sample(look.name, (ctx) => strokeLines(ctx, [[[2, 11], [50, 11]]], look, p, 1, 1))),
    sample("Slab contour, km", (ctx) => line(ctx, p.slab, 1)),
    sample("Diffuse zone (hatched)", (ctx) => line(ctx, p.zone, 1, [2, 2])),
    sample("Hotspot", (ctx) => { ctx.fillStyle = p.hot; ctx.beginPath(); ctx.arc(26, 9, 3.2, 0, 7); ctx.fill(); }),
    sample("To the nearest boundary", (ctx) => line(ctx, p.mark, 1.8)),
    sample("To the controlling one", (ctx) => line(ctx, p.mark, 1.8, [7, 4])),
    sample("Motion of the plate across, 1σ at its tip: an ellipse, or a bar where only σ of the rate is known", (ctx) => {
      line(ctx, p.ink, 2);
      ctx.fillStyle = p.ink;
      ctx.beginPath();
      ctx.moveTo(51, 9);
      ctx.lineTo(43, 5);
      ctx.lineTo(43, 13);
      ctx.fill();
    }),
  );
}
