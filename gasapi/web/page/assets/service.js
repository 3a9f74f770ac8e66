// Questions to the service that the page came from, and to nothing else.

import { askForToken, token } from "./token.js";

const base = new URL("./", location.href);
const sheet = document.querySelector("main");
let waiting = 0;

/** What the service refused, in its own words: RFC 9457, with the members at fault. */
export class Refusal extends Error {
  constructor(status, problem) {
    super(problem.detail || problem.title || `the service answered with status ${status}`);
    this.status = status;
    this.faults = problem.errors || [];
  }

  /** All that was said, each sentence once. */
  get words() {
    return [...new Set([this.message, ...this.faults.map((fault) => fault.detail)])].join(" ");
  }
}

/** Return what an error has to say to a person. */
export function wordsOf(error) {
  return error.words || error.message;
}

/** The address of a call, for people to copy. */
export function address(path) {
  return new URL(path, base).href;
}

/** Post a body as JSON and return the answer. */
export function post(path, body, { signal } = {}) {
  const headers = { "Content-Type": "application/json", Accept: "application/json" };
  return busy(async () => (await send(path, { method: "POST", body: JSON.stringify(body), headers, signal })).json());
}

/** Fetch an answer as JSON. */
export function get(path, { signal } = {}) {
  return busy(async () => (await send(path, { headers: { Accept: "application/json" }, signal })).json());
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

/** Let assistive technology know that the sheet is being changed for as long as anything is awaited. */
async function busy(asked) {
  waiting += 1;
  sheet.setAttribute("aria-busy", "true");
  try {
    return await asked();
  } finally {
    waiting -= 1;
    if (!waiting) sheet.removeAttribute("aria-busy");
  }
}

async function problemOf(answer) {
  try {
    return await answer.json();
  } catch {
    return {};
  }
}
