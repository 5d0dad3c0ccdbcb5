// Talking to the server: JSON with the CSRF token, refusals as errors that can be shown.

export class Refusal extends Error {
  constructor({ code, message, remedy }) {
    super([message, remedy].filter(Boolean).join(" "));
    this.code = code;
  }
}

const LOST = { code: "no_connection", message: "The server does not answer.", remedy: "Nothing was lost here; try again when the connection is back." };
const ODD = { code: "odd_answer", message: "The server gave no answer that can be read.", remedy: "Load the page again; you may have to sign in." };

async function ask(address, options) {
  let answer;
  try { answer = await fetch(address, { credentials: "same-origin", redirect: "manual", ...options }); } catch { throw new Refusal(LOST); }
  const body = await answer.json().catch(() => null);
  if (!body) throw new Refusal(ODD);
  if (body.error) throw new Refusal(body.error);
  return body;
}

export const load = (address) => ask(address, { headers: { Accept: "application/json" } });

export function post(address, token, body) {
  return ask(address, {
    method: "POST",
    headers: { "Content-Type": "application/json", Accept: "application/json", "X-CSRFToken": token },
    body: JSON.stringify(body),
  });
}
