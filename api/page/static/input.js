// Pointer and keyboard on the map.
export function attach(globe, on) {
  const c = globe.canvas, pointers = new Map();
  let moved = 0, pinch = 0;
  const at = (e) => {
    const r = c.getBoundingClientRect();
    return [e.clientX - r.left, e.clientY - r.top];
  };
  c.addEventListener("pointerdown", (e) => {
    c.setPointerCapture(e.pointerId);
    pointers.set(e.pointerId, at(e));
    if (pointers.size === 1) moved = 0;
    globe.cross = false;
    pinch = 0;
  });
  c.addEventListener("pointermove", (e) => {
    const before = pointers.get(e.pointerId);
    if (!before) return;
    const now = at(e);
    pointers.set(e.pointerId, now);
    if (pointers.size === 1) {
      moved += Math.hypot(now[0] - before[0], now[1] - before[1]);
      if (moved > 4) globe.pan(now[0] - before[0], now[1] - before[1]);
      return;
    }
    moved = 99;
    const [a, b] = [...pointers.values()], apart = Math.hypot(a[0] - b[0], a[1] - b[1]);
    if (pinch) globe.zoomBy(apart / pinch, (a[0] + b[0]) / 2, (a[1] + b[1]) / 2);
    pinch = apart;
  });
  const up = (e) => {
    const had = pointers.delete(e.pointerId);
    pinch = 0;
    if (had && e.type === "pointerup" && moved <= 4 && e.button === 0) on.pick(...at(e));
  };
  c.addEventListener("pointerup", up);
  c.addEventListener("pointercancel", up);
  c.addEventListener("dblclick", () => on.finish());
  c.addEventListener("wheel", (e) => {
    e.preventDefault();
    globe.zoomBy(Math.exp(-e.deltaY * (e.deltaMode ? 0.05 : 0.0015)), ...at(e));
  }, { passive: false });

  const step = 60;
  const keys = {
    ArrowLeft: () => globe.pan(step, 0), ArrowRight: () => globe.pan(-step, 0),
    ArrowUp: () => globe.pan(0, step), ArrowDown: () => globe.pan(0, -step),
    "+": () => globe.zoomBy(1.5), "=": () => globe.zoomBy(1.5), "-": () => globe.zoomBy(1 / 1.5), _: () => globe.zoomBy(1 / 1.5),
    Enter: () => on.pick(globe.w / 2, globe.h / 2), " ": () => on.pick(globe.w / 2, globe.h / 2),
    Backspace: () => on.undo(), Escape: () => on.cancel(), f: () => on.finish(),
  };
  c.addEventListener("keydown", (e) => {
    if (e.ctrlKey || e.metaKey || e.altKey || !keys[e.key]) return;
    e.preventDefault();
    globe.cross = true;
    keys[e.key]();
    globe.redraw();
  });
  c.addEventListener("focus", () => { globe.cross = c.matches(":focus-visible"); globe.redraw(); });
  c.addEventListener("blur", () => { globe.cross = false; globe.redraw(); });
}
