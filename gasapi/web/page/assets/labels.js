// Words in a picture that do not cover each other: each tries its places in turn and is left out where all are taken.

import { svg } from "./elements.js";

const LETTER = 7.2;
const LINE = 15;

/** A picture's words. `inside` is {left, right, top, bottom}, beyond which no word goes. */
export class Labels {
  constructor(picture, inside) {
    this.picture = picture;
    this.inside = inside;
    this.taken = [];
  }

  /** Write words at the first of some places [x, y, anchor] that is free; return whether there was one. */
  write(words, places, kind, attributes = {}) {
    const wide = words.length * LETTER;
    for (const [x, y, anchor = "start"] of places) {
      const left = anchor === "end" ? x - wide : anchor === "middle" ? x - wide / 2 : x;
      const box = { left, right: left + wide, top: y - LINE + 3, bottom: y + 4 };
      if (!this.holds(box) || this.taken.some((other) => covers(box, other))) continue;
      this.taken.push(box);
      this.picture.append(svg("text", { class: `${kind} halo`, x, y, "text-anchor": anchor, ...attributes }, words));
      return true;
    }
    return false;
  }

  /** Keep a place free of words. */
  keep(left, top, right, bottom) {
    this.taken.push({ left, top, right, bottom });
  }

  holds(box) {
    const { left, right, top, bottom } = this.inside;
    return box.left >= left && box.right <= right && box.top >= top && box.bottom <= bottom;
  }
}

function covers(one, other) {
  return one.left < other.right && other.left < one.right && one.top < other.bottom && other.top < one.bottom;
}
