// el builds an element. Attributes whose value is null or false are left out; text is
// always text, never markup.
export function el(name, attrs, ...children) {
  const e = document.createElement(name);
  for (const [k, v] of Object.entries(attrs || {})) {
    if (v === null || v === false || v === undefined) continue;
    if (k.startsWith("on")) e.addEventListener(k.slice(2), v);
    else e.setAttribute(k, v === true ? "" : v);
  }
  e.append(...children.flat().filter((c) => c !== null && c !== undefined && c !== false));
  return e;
}

export const byId = (id) => document.getElementById(id);

// fill replaces what an element holds; absent parts are left out.
export function fill(e, ...children) {
  e.replaceChildren(...children.flat().filter((c) => c !== null && c !== undefined && c !== false));
}

// say speaks to assistive technology.
export function say(text) {
  byId("status").textContent = text;
}

// symbol draws a marker's path as an inline picture.
export function symbol(d, colour) {
  const ns = "http://www.w3.org/2000/svg";
  const svg = document.createElementNS(ns, "svg");
  svg.setAttribute("viewBox", "-8 -8 16 16");
  svg.setAttribute("class", "sym");
  svg.setAttribute("aria-hidden", "true");
  const path = document.createElementNS(ns, "path");
  path.setAttribute("d", d);
  path.setAttribute("fill", colour);
  svg.append(path);
  return svg;
}

// copyButton copies text, or selects it where the browser does not allow copying.
export function copyButton(text, source, name) {
  const b = el("button", { type: "button", "aria-label": name }, "Copy");
  b.addEventListener("click", async () => {
    try {
      await navigator.clipboard.writeText(text);
      b.textContent = "Copied";
      say("Copied");
    } catch {
      getSelection().selectAllChildren(source);
      say("Selected; copy it with your keyboard");
    }
  });
  return b;
}
