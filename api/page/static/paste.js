// Several lines pasted into the field for one place: a table, or a list of places.
import { parse } from "./coords.js";

const names = /(^|[\t,;|"])\s*(lon|long|longitude)\b/i, lats = /(^|[\t,;|"])\s*(lat|latitude)\b/i;

const cell = (s) => `"${s.replace(/"/g, '""')}"`;

// table turns pasted text into {text, note} for the service, text being CSV; null where
// it is one line, or none that is understood.
export function table(pasted) {
  const lines = pasted.split(/\r?\n|\r/).map((l) => l.trimEnd()).filter((l) => l.trim() !== "");
  if (lines.length < 2) return null;
  if (names.test(lines[0]) && lats.test(lines[0])) {
    return { text: lines.join("\n") + "\n", note: "" };
  }
  const rows = [];
  let unsure = false;
  for (const line of lines) {
    const at = parse(line);
    if (at.error) continue;
    unsure ||= !at.sure;
    rows.push(`${cell(line.replace(/\t/g, " ").trim())},${at.lon},${at.lat}`);
  }
  if (rows.length < 2) return null;
  const lost = lines.length - rows.length;
  return {
    text: `name,lon,lat\n${rows.join("\n")}\n`,
    note: [lost ? `${lost} of ${lines.length} lines were not understood.` : "", unsure ? "Latitude was read first where nothing says which number it is." : ""].filter(Boolean).join(" "),
  };
}
