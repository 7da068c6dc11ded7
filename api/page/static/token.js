// The form for a token, for services that want one.
import { byId, say } from "./dom.js";
import { hasToken, setToken } from "./service.js";

const form = byId("access"), why = byId("access-why"), field = byId("token"), change = byId("token-change");

function show(text) {
  const appears = form.hidden;
  form.hidden = false;
  why.textContent = text;
  if (appears && document.activeElement === document.body) field.focus();
}

function settle() {
  change.hidden = !hasToken();
  byId("token-forget").hidden = !hasToken();
}

// reasons: what a refusal means to who reads it.
function reason({ status, sent, problem }) {
  if (status === 403) return `${problem.title}: ${(problem.errors || []).map((e) => e.detail).join("; ") || "another token is needed"}.`;
  if (sent) return "This token is not known to the service. Check it, or ask the service's operators for one.";
  return "This service answers holders of a token. Enter the one that its operators gave you.";
}

export function attachToken() {
  settle();
  addEventListener("token-needed", (e) => {
    if (e.detail.status === 401 && e.detail.sent) setToken(""); // it opens nothing
    settle();
    show(reason(e.detail));
  });
  form.addEventListener("submit", (e) => {
    e.preventDefault();
    const t = field.value.trim();
    if (!/^[\x21-\x7e]+$/.test(t)) {
      show(t ? "A token has no blanks and none but plain letters, digits and signs. Copy it again." : "The field is empty. Enter the token that the service's operators gave you.");
      field.focus();
      return;
    }
    field.value = "";
    form.hidden = true;
    say("The token is sent with every question until this tab is closed");
    setToken(t);
    settle();
  });
  byId("token-forget").addEventListener("click", () => {
    setToken("");
    settle();
    show("The token is forgotten.");
    field.focus();
  });
  change.addEventListener("click", () => { show("The token is kept in this tab alone, and sent in a header."); field.focus(); });
}
