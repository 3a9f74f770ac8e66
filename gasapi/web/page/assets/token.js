// The token of this visit: kept in this tab until it is closed, sent to this service only.

const KEY = "gasapi-token";
let asking = null;
let declined = false;

export function token() {
  return sessionStorage.getItem(KEY);
}

/** Ask for a token once, however many requests wait for it. Return whether there is another one to try. */
export function askForToken(used) {
  if (token() !== used) return Promise.resolve(true);
  if (declined) return Promise.resolve(false);
  asking ||= dialog(used).finally(() => (asking = null));
  return asking;
}

function dialog(used) {
  const box = document.getElementById("token-dialog");
  const field = document.getElementById("token");
  if (used) document.getElementById("token-why").textContent = "The token is not good here. Give another one.";
  field.value = "";
  box.returnValue = "";
  box.showModal();
  return new Promise((resolve) => {
    box.addEventListener(
      "close",
      () => {
        const given = box.returnValue === "use" ? field.value.trim() : "";
        if (given) sessionStorage.setItem(KEY, given);
        else declined = true;
        resolve(Boolean(given));
      },
      { once: true },
    );
  });
}
