// Leaves of the sheet, chosen in the address; the address bar holds the question before them and the leaf's own fields after.

const leaves = [...document.querySelectorAll("section.leaf")];
const links = [...document.querySelectorAll("a[data-leaf]")];

/** Show the leaf that the address names, now and whenever it changes. */
export function leavesIn(shown) {
  function turn() {
    const wanted = leafOf(location.hash);
    for (const leaf of leaves) leaf.hidden = leaf.id !== wanted;
    for (const link of links) {
      if (link.dataset.leaf === wanted) link.setAttribute("aria-current", "page");
      else link.removeAttribute("aria-current");
    }
    shown(wanted);
  }
  addEventListener("hashchange", turn);
  turn();
}

/** Return the fields that the address gives for a leaf. */
export function fieldsOf(leaf) {
  return new URLSearchParams(leafOf(location.hash) === leaf ? location.hash.split("?")[1] || "" : "");
}

/** Write the question into the address bar, and the fields of the open leaf where it has some. */
export function writeAddress(query, fields) {
  const leaf = leafOf(location.hash);
  const kept = fields === undefined ? location.hash.split("?")[1] || "" : String(fields);
  const hash = leaf === "stands" && !kept ? "" : `#${leaf}${kept ? `?${kept}` : ""}`;
  history.replaceState(null, "", `${location.pathname}${query === null ? location.search : `?${query}`}${hash}`);
}

function leafOf(hash) {
  const name = hash.slice(1).split("?")[0];
  return leaves.some((leaf) => leaf.id === name) ? name : "stands";
}
