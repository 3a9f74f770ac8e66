// The same question for a program: to copy into a gateway, a historian or a script.

import { html } from "./elements.js";
import { address } from "./service.js";

/** Draw the ways to ask a question without this page. */
export function drawCalls(place, question) {
  const forms = callsOf(question);
  if (place.children.length !== forms.length) {
    place.replaceChildren(...forms.map((form) => callForm(form)));
  }
  forms.forEach((form, n) => {
    const code = place.children[n].querySelector("code");
    if (code.textContent !== form.text) code.textContent = form.text;
  });
}

/** Return [{id, title, text}] of a question. */
export function callsOf({ body, query, page }) {
  const whole = new URL(location.href);
  whole.search = page;
  whole.hash = "";
  return [
    { id: "link", title: "Link to this page", text: whole.href },
    { id: "get", title: "Address that answers by itself (GET)", text: address(`v1/state?${query}`) },
    { id: "curl", title: "curl", text: curl(body) },
    { id: "python", title: "Python, with the client of this package", text: python(body) },
    {
      id: "line",
      title: "One line for a controller: status_code, density, compressibility_factor, molar_volume, region",
      text: `curl -H 'Accept: text/csv; header=absent' ${quoted(address(`v1/state?${query}`))}`,
    },
  ];
}

function callForm({ id, title, text }) {
  const button = html("button", { type: "button", "aria-label": `Copy: ${title}` }, "Copy");
  const code = html("code", {}, text);
  button.addEventListener("click", async () => {
    button.textContent = (await copied(code)) ? "Copied" : "Selected: press Ctrl+C";
    setTimeout(() => (button.textContent = "Copy"), 1600);
  });
  return html("section", { class: "call-form", id: `call-${id}` }, html("header", {}, html("h3", {}, title), button), html("pre", {}, code));
}

/** Put a text on the clipboard; where the browser withholds it (plain HTTP from another machine), select it instead. */
async function copied(code) {
  try {
    await navigator.clipboard.writeText(code.textContent);
    return true;
  } catch {
    getSelection().selectAllChildren(code);
    return false;
  }
}

function curl(body) {
  return `curl -H 'Content-Type: application/json' -d ${quoted(JSON.stringify(body))} ${quoted(address("v1/state"))}`;
}

function quoted(text) {
  return `'${text.replaceAll("'", "'\\''")}'`;
}

function python(body) {
  const given = Object.entries(body).map(([name, value]) => `    ${name}=${literal(value)},`);
  return [
    "from gasapi.client import Client",
    "",
    `client = Client(${literal(address("").replace(/\/$/, ""))})`,
    "answer = client.state(",
    ...given,
    ")",
    'print(answer["result"]["density"], answer["quality"]["level"])',
  ].join("\n");
}

function literal(value) {
  if (value === true) return "True";
  if (value === false) return "False";
  if (value === null) return "None";
  if (typeof value === "object") return `{${Object.entries(value).map(([k, v]) => `${JSON.stringify(k)}: ${literal(v)}`).join(", ")}}`;
  return JSON.stringify(value);
}
