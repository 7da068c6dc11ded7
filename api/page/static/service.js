// Requests to the service, and what the page does while it is away.
import { byId, say } from "./dom.js";

let away = null; // the poll that runs while the service cannot be reached
let waiting = []; // what is to be done when it is back

export class ProblemError extends Error {
  constructor(problem) {
    super((problem.errors || []).map((e) => `${e.parameter || e.pointer || (e.line ? "line " + e.line : "")}: ${e.detail}`.replace(/^: /, "")).join("; ") || problem.title);
    this.problem = problem;
  }
}

export class AwayError extends Error {}

// ask sends a request. It throws ProblemError for an answer that is a problem
// document and AwayError where the service cannot be reached.
export async function ask(path, options = {}) {
  let r, body;
  try {
    r = await fetch(path, options);
    body = await r.text();
  } catch (e) {
    if (e.name === "AbortError") throw e;
    lost();
    throw new AwayError("the service cannot be reached");
  }
  if (r.status === 502 || r.status === 503 || r.status === 504) {
    lost();
    throw new AwayError("the service cannot be reached");
  }
  if (!r.ok) {
    let p = { title: `status ${r.status}` };
    try { p = JSON.parse(body); } catch { /* not a problem document: the status says it */ }
    throw new ProblemError(p);
  }
  return body;
}

export const askJSON = async (path, options) => JSON.parse(await ask(path, options));

// whenBack does something once the service is back. One thing of a name waits.
export function whenBack(name, f) {
  waiting = waiting.filter((w) => w.name !== name).concat({ name, f });
}

function lost() {
  if (away) return;
  const note = byId("offline");
  note.textContent = "The service cannot be reached. What is shown stays; the page asks again by itself.";
  note.hidden = false;
  let wait = 1000;
  const poll = async () => {
    try {
      const r = await fetch("/readyz", { cache: "no-store" });
      if (r.ok) {
        away = null;
        note.hidden = true;
        say("The service is back");
        const todo = waiting;
        waiting = [];
        for (const w of todo) w.f();
        return;
      }
    } catch { /* still away */ }
    wait = Math.min(wait * 1.5, 15000);
    away = setTimeout(poll, wait);
  };
  away = setTimeout(poll, wait);
}
