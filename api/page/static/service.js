// Requests to the service: where it stands, its token, and what the page does while it
// is away or lets nobody in.
import { byId, say } from "./dom.js";

// root is the address below which the service stands: this file is in assets/ below it.
const root = new URL("../", import.meta.url);

// address returns the full address of a path of the service, such as "v1/point".
export const address = (path) => new URL(path, root).href;

// The token lives as long as the tab, and is sent in a header alone.
const tokenKey = "nearmargin.token";
let token = stored();

function stored() {
  try { return sessionStorage.getItem(tokenKey) || ""; } catch { return ""; }
}

export const hasToken = () => token !== "";

export function setToken(t) {
  token = t;
  try {
    if (t) sessionStorage.setItem(tokenKey, t);
    else sessionStorage.removeItem(tokenKey);
  } catch { /* no storage: the token lasts until the page is left */ }
  if (t) goOn();
}

// quoted quotes a text for a shell.
const quoted = (s) => `'${s.replace(/'/g, "'\\''")}'`;

// curl returns the command that asks what the page asks. The token is named, not shown.
export function curl(path, ...args) {
  const auth = token ? ['-H "Authorization: Bearer $NEARMARGIN_TOKEN"'] : [];
  return ["curl -s", ...auth, ...args.map((a) => (a.startsWith("-") ? a : quoted(a))), quoted(address(path))].join(" ");
}

let away = null; // the poll that runs while the service cannot be reached
let waiting = []; // what is to be done when the service answers again

export class ProblemError extends Error {
  constructor(problem) {
    super((problem.errors || []).map((e) => `${e.parameter || e.pointer || (e.line ? "line " + e.line : "")}: ${e.detail}`.replace(/^: /, "")).join("; ") || problem.title);
    this.problem = problem;
  }
}

// HeldError is thrown where a request is worth sending again later: the service cannot
// be reached, or it wants a token.
export class HeldError extends Error {}

// ask sends a request to a path. It throws ProblemError for an answer that is a problem
// document, and HeldError where later may do.
export async function ask(path, options = {}) {
  const headers = token ? { ...options.headers, Authorization: `Bearer ${token}` } : options.headers;
  const sent = token;
  let r, body;
  try {
    r = await fetch(address(path), { ...options, headers });
    body = await r.text();
  } catch (e) {
    if (e.name === "AbortError") throw e;
    lost("The service cannot be reached.");
    throw new HeldError("the service cannot be reached");
  }
  if (r.ok) return body;
  let p = { title: `Status ${r.status}` };
  try { p = JSON.parse(body); } catch { /* not a problem document: the status says it */ }
  if (r.status === 401 || r.status === 403) {
    dispatchEvent(new CustomEvent("token-needed", { detail: { status: r.status, sent, problem: p } }));
    throw new HeldError(p.title);
  }
  if (r.status === 502 || r.status === 503 || r.status === 504) {
    lost(r.status === 503 && p.type ? `${p.title}.` : "The service cannot be reached.");
    throw new HeldError(p.title);
  }
  throw new ProblemError(p);
}

export const askJSON = async (path, options) => JSON.parse(await ask(path, options));

// later does something once the service is back, or has a token. One thing of a name
// waits.
export function later(name, f) {
  waiting = waiting.filter((w) => w.name !== name).concat({ name, f });
}

// goOn does what was waiting.
function goOn() {
  const todo = waiting;
  waiting = [];
  for (const w of todo) w.f();
}

function lost(why) {
  if (away) return;
  const note = byId("offline");
  note.textContent = `${why} What is shown stays; the page asks again by itself.`;
  note.hidden = false;
  let wait = 1000;
  const poll = async () => {
    try {
      const r = await fetch(address("readyz"), { cache: "no-store" });
      if (r.ok) {
        away = null;
        note.hidden = true;
        say("The service is back");
        goOn();
        return;
      }
    } catch { /* still away */ }
    wait = Math.min(wait * 1.5, 15000);
    away = setTimeout(poll, wait);
  };
  away = setTimeout(poll, wait);
}
