// Questions to the service that the page came from, and to nothing else.

import { askForToken, token } from "./token.js";

const base = new URL("./", location.href);

/** What the service refused, in its own words: RFC 9457, with the members at fault. */
export class Refusal extends Error {
  constructor(status, problem) {
    super(problem.detail || problem.title || `the service answered with status ${status}`);
    this.status = status;
    this.faults = problem.errors || [];
  }
}

/** The address of a call, for people to copy. */
export function address(path) {
  return new URL(path, base).href;
}

/** Post a body as JSON and return the answer. */
export async function post(path, body, { signal } = {}) {
  const answer = await send(path, {
    method: "POST",
    body: JSON.stringify(body),
    headers: { "Content-Type": "application/json", Accept: "application/json" },
    signal,
  });
  return answer.json();
}

/** Fetch an answer as JSON. */
export async function get(path, { signal } = {}) {
  const answer = await send(path, { headers: { Accept: "application/json" }, signal });
  return answer.json();
}

/** Send a request, with the token of this visit where there is one; ask for one where the service wants it. */
export async function send(path, options) {
  for (;;) {
    const used = token();
    const headers = { ...options.headers };
    if (used) headers.Authorization = `Bearer ${used}`;
    let answer;
    try {
      answer = await fetch(new URL(path, base), { ...options, headers, cache: "no-store" });
    } catch (error) {
      if (error.name === "AbortError") throw error;
      throw new Refusal(0, { detail: "The service cannot be reached. What stands below may be out of date." });
    }
    if (answer.ok) return answer;
    if (answer.status === 401 && (await askForToken(used))) continue;
    throw new Refusal(answer.status, await problemOf(answer));
  }
}

async function problemOf(answer) {
  try {
    return await answer.json();
  } catch {
    return {};
  }
}
