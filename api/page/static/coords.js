// Coordinates as people paste them.
//
// parse(text) returns {lon, lat, swapped, sure} in degrees, or {error}. sure is false
// where nothing but custom says which number is the latitude: then latitude is taken
// first, and swapped is the other reading where that is possible.

const numberForm = /[-+\u2212\u2013]?\d+(?:\.\d+)?|[-+\u2212\u2013]?\.\d+/g;

const toNumber = (s) => Number(s.replace(/[\u2212\u2013]/g, "-"));

const inRange = (lon, lat) => lon >= -180 && lon <= 360 && Math.abs(lat) <= 90;

const wrap = (lon) => (lon > 180 ? lon - 360 : lon);

function found(lon, lat, sure) {
  if (!inRange(lon, lat)) {
    const what = Math.abs(lat) > 90 ? `latitude ${lat} is beyond 90` : `longitude ${lon} is not within -180 and 360`;
    return { error: `${what}; write latitude and longitude in degrees, such as 33.5 S 71.6 W` };
  }
  const out = { lon: wrap(lon), lat, sure };
  if (!sure && inRange(lat, lon)) out.swapped = { lon: wrap(lat), lat: lon, sure: false };
  return out;
}

// degrees adds up degrees, minutes and seconds; NaN where they cannot be such.
function degrees(parts) {
  const [d, m = 0, s = 0] = parts;
  if (parts.length > 3 || m < 0 || m >= 60 || s < 0 || s >= 60) return NaN;
  if (parts.length > 1 && !Number.isInteger(d)) return NaN;
  const sign = d < 0 || Object.is(d, -0) ? -1 : 1;
  return sign * (Math.abs(d) + m / 60 + s / 3600);
}

// decimalCommas turns "33,5" into "33.5" where the commas can be nothing else: in a
// text of two such numbers that something other than a comma parts.
function decimalCommas(text) {
  const m = text.match(/^\D*?[-+\u2212]?\d+,\d+\D*?(?:[\s;/NSEWO°º]+)\D*?[-+\u2212]?\d+,\d+\D*$/i);
  return m && !/\d\.\d/.test(text) ? text.replace(/(\d),(\d)/g, "$1.$2") : text;
}

const hemisphere = /[NSEW]/g;
const otherLetters = /[A-DF-MO-RT-VX-Z]/;
const isLat = (c) => c === "N" || c === "S";

// signed gives an angle the sign of its hemisphere.
const signed = (v, c) => (v >= 0 && (c === "S" || c === "W") ? -v : v);

// angle reads one angle: {deg, letter, decimal}, or null. letter is that of its
// hemisphere, "" where it has none; the sign is in deg.
function angle(text) {
  const t = text.trim().toUpperCase().replace(/\b(NORTH|SOUTH|EAST|WEST)\b/g, (w) => w[0]);
  const letters = t.match(hemisphere) || [];
  if (letters.length > 1 || otherLetters.test(t) || !/^[NSEW]?[^NSEW]*\d[^NSEW]*[NSEW]?$/.test(t)) return null;
  const deg = degrees((t.match(numberForm) || []).map(toNumber));
  const letter = letters[0] || "";
  return Number.isNaN(deg) ? null : { deg: signed(deg, letter), letter, decimal: t.includes(".") };
}

function withHemispheres(text) {
  const t = text.toUpperCase().replace(/\b(NORTH|SOUTH|EAST|WEST)\b/g, (w) => w[0]);
  if (/\d[\s°º'"]*O\b/.test(t)) return { error: "O may be west (oeste, ouest) or east (Ost); write W or E" };
  const letters = t.match(hemisphere) || [];
  if (otherLetters.test(t)) return null;
  if (letters.length === 1) return oneHemisphere(t);
  if (letters.length !== 2) return null;
  if (isLat(letters[0]) === isLat(letters[1])) return { error: `both are ${isLat(letters[0]) ? "latitudes" : "longitudes"}; write 33.5 S 71.6 W` };
  const first = t.search(/[NSEW0-9]/);
  const before = /[NSEW]/.test(t[first]); // S33.5 W71.6 rather than 33.5S 71.6W
  const cut = before ? t.slice(first + 1).search(/[NSEW]/) + first + 1 : t.search(/[NSEW]/) + 1;
  const values = [t.slice(0, cut), t.slice(cut)].map((s) => degrees((s.match(numberForm) || []).map(toNumber)));
  if (values.some(Number.isNaN)) return { error: "degrees, minutes and seconds do not fit: minutes and seconds lie within 0 and 60" };
  const [a, b] = values.map((v, i) => signed(v, letters[i]));
  return isLat(letters[0]) ? found(b, a, true) : found(a, b, true);
}

// oneHemisphere reads two angles of which one has a letter; the other must have a
// sign, since nothing else says its hemisphere.
function oneHemisphere(t) {
  const parts = (t.match(new RegExp(angleForm, "g")) || []).map(angle);
  if (parts.length !== 2 || parts.includes(null)) return null;
  const [a, b] = parts[0].letter ? parts : [parts[1], parts[0]];
  if (!/[-+\u2212]/.test(t)) return { error: `the hemisphere of ${b.deg} is missing; write 33.5 S 71.6 W` };
  return isLat(a.letter) ? found(b.deg, a.deg, true) : found(a.deg, b.deg, true);
}

// angleForm is an angle after its name.
const angleForm = "[NSEW]?\\s*[-+\\u2212]?\\d*\\.?\\d+(?:\\s*[°º:]\\s*(?:\\d+(?:\\.\\d+)?\\s*['\\u2032:]?\\s*(?:\\d+(?:\\.\\d+)?\\s*[\"\\u2033]?\\s*)?)?)?\\s*(?:[NSEW]\\b)?";

function named(text) {
  const get = (names, letters) => {
    const m = text.match(new RegExp(`\\b(?:${names})\\b["']?\\s*[:=]?\\s*(${angleForm})`, "i"));
    const a = m && angle(m[1]);
    return a && (!a.letter || letters.includes(a.letter)) ? a.deg : null;
  };
  const lat = get("latitude|lat|y", "NS"), lon = get("longitude|long|lon|lng|x", "EW");
  return lat === null || lon === null ? null : found(lon, lat, true);
}

// ordered reads forms that say themselves which number is first.
function ordered(text) {
  let m = text.match(/"coordinates"\s*:\s*\[\s*([^,\]]+),\s*([^,\]]+)/);
  if (m) return found(toNumber(m[1]), toNumber(m[2]), true);
  m = text.match(/\bPOINT\s*Z?\s*\(\s*(\S+)\s+([^\s)]+)/i);
  if (m) return found(toNumber(m[1]), toNumber(m[2]), true);
  m = text.match(/^\s*geo:([^,]+),([^,;?]+)/i);
  return m ? found(toNumber(m[2]), toNumber(m[1]), true) : null;
}

// row reads a row of a table: the first two neighbouring cells with the letters of
// hemispheres, else the first two numbers that can be a position, of which at least one
// has a decimal.
function row(text) {
  const sep = ["\t", ";", "|", ","].find((s) => text.split(s).length > 2);
  if (!sep) return null;
  const cells = text.split(sep).map((c) => c.trim().replace(/^"(.*)"$/, "$1"))
    .map((c) => angle(sep !== "," ? c.replace(/^([-+]?\d+),(\d+)/, "$1.$2") : c));
  const pairs = cells.slice(1).map((b, i) => [cells[i], b]).filter(([a, b]) => a && b);
  const sure = pairs.find(([a, b]) => a.letter && b.letter && isLat(a.letter) !== isLat(b.letter));
  if (sure) return isLat(sure[0].letter) ? found(sure[1].deg, sure[0].deg, true) : found(sure[0].deg, sure[1].deg, true);
  const bare = pairs.find(([a, b]) => !a.letter && !b.letter && (a.decimal || b.decimal) && (inRange(b.deg, a.deg) || inRange(a.deg, b.deg)));
  return bare ? pair(bare[0].deg, bare[1].deg) : null;
}

function pair(a, b) {
  if (Math.abs(a) > 90) return found(a, b, true);
  return found(b, a, Math.abs(b) > 90);
}

export function parse(input) {
  const text = decimalCommas(input.trim().replace(/[\u00a0\u2009\u202f]/g, " ").replace(/''|\u201d/g, '"').replace(/\u2019/g, "'"));
  if (!/\d/.test(text)) return { error: "there is no number in it; write latitude and longitude, such as 33.5 S 71.6 W" };
  const letters = withHemispheres(text);
  const direct = ordered(text) || named(text) || (letters?.error && row(text)) || letters || row(text);
  if (direct) return direct;
  if (/\d[\s°º'\u2032"\u2033]*[NSEW]\b/.test(text)) return { error: "the letters of the hemispheres do not fit the numbers; write 33.5 S 71.6 W" };
  const n = (text.match(numberForm) || []).map(toNumber);
  if (/[°º'\u2032"\u2033:]/.test(text) && n.length % 2 === 0 && n.length > 2) {
    const half = n.length / 2;
    const a = degrees(n.slice(0, half)), b = degrees(n.slice(half));
    if (!Number.isNaN(a) && !Number.isNaN(b)) return pair(a, b);
  }
  if (n.length !== 2) {
    return { error: `${n.length === 1 ? "one number is" : n.length + " numbers are"} in it, and which are latitude and longitude is not clear; write 33.5 S 71.6 W` };
  }
  return pair(n[0], n[1]);
}

// words writes a position for people.
export function words(lon, lat, decimals = 4) {
  const part = (v, plus, minus) => `${Math.abs(v).toFixed(decimals)}° ${v < 0 ? minus : plus}`;
  return `${part(lat, "N", "S")}, ${part(lon, "E", "W")}`;
}
