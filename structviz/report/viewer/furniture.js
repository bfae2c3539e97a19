// What stands around the model: north arrow, scale bar, coordinates under the cursor, and the legend.

import { Vector3 } from "three";
import { NOTHING, stops } from "./colours.js";
import { element, number } from "./panel.js";

const NS = "http://www.w3.org/2000/svg";
const ROUND = [1, 2, 5, 10];
const WORDS = ["conflicting", "undetermined", "consistent"];
export const GLYPH_NOTE = "Glyphs: pressed along σ1, longest along σ3";

export function makeFoot() {
  const compass = document.createElementNS(NS, "svg");
  compass.setAttribute("class", "sv-compass");
  compass.setAttribute("viewBox", "-23 -23 46 46");
  compass.setAttribute("role", "img");
  compass.setAttribute("aria-label", "North arrow");
  compass.innerHTML = '<circle r="21" fill="none" stroke="currentColor" stroke-opacity=".25"/><path fill="currentColor"/><text text-anchor="middle" font-size="11" font-weight="600" fill="currentColor" dy=".36em">N</text>';
  const bar = element("div");
  const length = element("span");
  const scale = element("div", { class: "sv-scale" }, bar, length);
  const where = element("div", { class: "sv-where" });
  const box = element("div", { class: "sv-panel sv-foot" }, compass, scale, where);
  const shown = { path: "", north: [0, 0], bar: 0, length: "" }; // for a saved picture

  function update(camera, width) {
    const x = new Vector3().setFromMatrixColumn(camera.matrixWorld, 0);
    const y = new Vector3().setFromMatrixColumn(camera.matrixWorld, 1);
    const [dx, dy] = [x.y, -y.y]; // north as it is seen, screen axes
    const [path, text] = [compass.children[1], compass.children[2]];
    const far = Math.hypot(dx, dy);
    shown.path = far > 0.05 ? `M${dx * 15} ${dy * 15} L${-dx * 9 - (dy / far) * 4.5} ${-dy * 9 + (dx / far) * 4.5} L${-dx * 5} ${-dy * 5} L${-dx * 9 + (dy / far) * 4.5} ${-dy * 9 - (dx / far) * 4.5}Z` : "M0 2 a2 2 0 1 0 .01 0Z";
    shown.north = far > 0.05 ? [(dx / far) * 17, (dy / far) * 17] : [0, -10];
    path.setAttribute("d", shown.path);
    text.setAttribute("x", shown.north[0]);
    text.setAttribute("y", shown.north[1]);
    const metre = (width * camera.zoom) / (camera.right - camera.left);
    const wanted = 110 / metre;
    const power = 10 ** Math.floor(Math.log10(wanted));
    const chosen = power * ROUND.filter((k) => k * power <= wanted).at(-1);
    shown.bar = chosen * metre;
    shown.length = chosen >= 1000 ? `${number(chosen / 1000)} km` : chosen >= 1 ? `${number(chosen)} m` : `${number(chosen, 2)} m`;
    bar.style.width = `${shown.bar}px`;
    length.textContent = shown.length;
  }

  return { box, update, where, shown };
}

export function fillWhere(where, origin, name, point, height, value) {
  if (!point) return where.replaceChildren();
  const [e, n, up] = [origin[0] + point.x, origin[1] + point.y, origin[2] + point.z / height];
  where.replaceChildren(element("b", { text: name }), value ? `  ${value}` : "", element("br"), `E ${number(e)}  N ${number(n)}  up ${number(up)} m`);
}

// A value of a field in words, with its unit; undefined where there is none.
export function worded({ low, step, unit }, code) {
  if (code === NOTHING) return undefined;
  const value = low + step * code;
  const digits = unit === "°" ? (step < 1 ? 1 : 0) : unit === "m" ? 0 : 2;
  return `${number(value, digits)}${unit === "°" ? "°" : unit === "m" ? " m" : ""}`;
}

// What the legend says, as data: for the page and for a saved picture.
export function legendOf(data, field, glyphs) {
  const note = glyphs ? GLYPH_NOTE : "";
  if (!field) return { words: WORDS.filter((word) => data.faults.some(({ verdict }) => verdict === word)), note };
  const unit = field.unit === "°" ? "°" : "";
  const whole = [field.low, (field.low + field.high) / 2, field.high].every((value) => Number.isInteger(value) || field.high > 10);
  const ends = [field.low, (field.low + field.high) / 2, field.high].map((value) => `${number(value, whole ? 0 : 1)}${unit}`);
  return { title: unit || !field.unit ? field.title : `${field.title}, ${field.unit}`, ends, stops: stops(field), note };
}

export function fillLegend(box, { words, title, ends, stops: colours, note }, data) {
  const rows = (words ?? []).map((word) => {
    const swatch = element("i");
    swatch.style.background = `var(--${word}, ${data.colours[word]})`;
    return element("div", {}, swatch, word);
  });
  if (title) {
    const bar = element("div", { class: "sv-bar" });
    bar.style.background = `linear-gradient(90deg, ${colours.join(",")})`;
    rows.push(element("div", { text: title }), bar, element("div", { class: "sv-ends" }, ...ends.map((text) => element("span", { text }))));
  }
  if (note) rows.push(element("div", { class: "sv-glyph-note", text: note }));
  box.replaceChildren(...rows);
}
