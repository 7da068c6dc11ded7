// Places and outlines as short text for a link: steps of whole 1e-5 degrees (1 m) from
// one place to the next, as bytes, in base64url.
const unit = 1e5;
const most = 200000; // values in a text, so that a bad link cannot fill the memory

class Writer {
  bytes = [];
  before = [0, 0];

  // count writes a whole number that is not negative, seven bits a byte.
  count(n) {
    for (; n >= 128; n = Math.floor(n / 128)) this.bytes.push((n % 128) + 128);
    this.bytes.push(n);
  }

  place(at) {
    for (const i of [0, 1]) {
      const v = Math.round(at[i] * unit), step = v - this.before[i];
      this.before[i] = v;
      this.count(step < 0 ? -2 * step - 1 : 2 * step);
    }
  }

  text(s) {
    const b = new TextEncoder().encode(s);
    this.count(b.length);
    for (const x of b) this.bytes.push(x);
  }

  toString() {
    let s = "";
    for (const b of this.bytes) s += String.fromCharCode(b);
    return btoa(s).replace(/\+/g, "-").replace(/\//g, "_").replace(/=+$/, "");
  }
}

class Reader {
  before = [0, 0];
  at = 0;

  constructor(text) {
    this.bytes = Uint8Array.from(atob(text.replace(/-/g, "+").replace(/_/g, "/")), (c) => c.charCodeAt(0));
  }

  count() {
    let n = 0, f = 1, b;
    do {
      if (this.at >= this.bytes.length || f > 2 ** 42) throw new Error("the link is cut off");
      b = this.bytes[this.at++];
      n += (b % 128) * f;
      f *= 128;
    } while (b >= 128);
    return n;
  }

  // times reads a count and calls f as often.
  times(f) {
    const n = this.count();
    if (n > most || n > this.bytes.length - this.at) throw new Error("the link is cut off");
    return Array.from({ length: n }, f);
  }

  place() {
    return [0, 1].map((i) => {
      const z = this.count();
      this.before[i] += z % 2 ? -(z + 1) / 2 : z / 2;
      return this.before[i] / unit;
    });
  }

  text() {
    return new TextDecoder().decode(Uint8Array.from(this.times(() => this.bytes[this.at++])));
  }
}

const inRange = ([lon, lat]) => lon >= -180 && lon <= 360 && Math.abs(lat) <= 90;

// attempt returns null for a text that is not what it should be.
function attempt(text, f) {
  try { return f(new Reader(text)); } catch { return null; }
}

// packArea writes a Polygon or MultiPolygon with its holes and parts.
export function packArea(g) {
  const w = new Writer(), parts = g.type === "Polygon" ? [g.coordinates] : g.coordinates;
  w.count(parts.length);
  for (const rings of parts) {
    w.count(rings.length);
    for (const ring of rings) {
      w.count(ring.length - 1); // the last position is the first again
      for (const p of ring.slice(0, -1)) w.place(p);
    }
  }
  return String(w);
}

export function unpackArea(text) {
  return attempt(text, (r) => {
    const parts = r.times(() => r.times(() => { const ring = r.times(() => r.place()); return [...ring, ring[0]]; }));
    const rings = parts.flat();
    if (!rings.length || rings.some((ring) => ring.length < 4 || !ring.every(inRange)) || parts.some((p) => !p.length)) return null;
    return parts.length === 1 ? { type: "Polygon", coordinates: parts[0] } : { type: "MultiPolygon", coordinates: parts };
  });
}

// packSites writes places, with their names where they are wanted.
export function packSites(sites, names) {
  const w = new Writer();
  w.count(names ? 1 : 0);
  w.count(sites.length);
  for (const s of sites) {
    w.place([s.lon, s.lat]);
    if (names) w.text(s.name);
  }
  return String(w);
}

export function unpackSites(text) {
  return attempt(text, (r) => {
    const names = r.count() === 1;
    const list = r.times(() => { const [lon, lat] = r.place(); return { lon, lat, name: names ? r.text() : "" }; });
    return list.length && list.every((s) => inRange([s.lon, s.lat])) ? list : null;
  });
}
