// What stands around the model: north arrow, scale bar, coordinates under the cursor, and the legend.

import { Vector3 } from "three";
import { stops } from "./colours.js";
import { element, number } from "./panel.js";

const NS = "http://www.w3.org/2000/svg";
const ROUND = [1, 2, 5, 10];

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

  function update(camera, controls, width) {
    const x = new Vector3().setFromMatrixColumn(camera.matrixWorld, 0);
    const y = new Vector3().setFromMatrixColumn(camera.matrixWorld, 1);
    const [dx, dy] = [x.y, -y.y]; // north as it is seen, screen axes
    const [path, text] = [compass.children[1], compass.children[2]];
    const far = Math.hypot(dx, dy);
    path.setAttribute("d", far > 0.05 ? `M${dx * 15} ${dy * 15} L${-dx * 9 - (dy / far) * 4.5} ${-dy * 9 + (dx / far) * 4.5} L${-dx * 5} ${-dy * 5} L${-dx * 9 + (dy / far) * 4.5} ${-dy * 9 - (dx / far) * 4.5}Z` : "M0 2 a2 2 0 1 0 .01 0Z");
    text.setAttribute("x", far > 0.05 ? (dx / far) * 17 : 0);
    text.setAttribute("y", far > 0.05 ? (dy / far) * 17 : -10);
    const metre = (width * camera.zoom) / (camera.right - camera.left);
    const wanted = 110 / metre;
    const power = 10 ** Math.floor(Math.log10(wanted));
    const chosen = power * ROUND.filter((k) => k * power <= wanted).at(-1);
    bar.style.width = `${chosen * metre}px`;
    length.textContent = chosen >= 1000 ? `${number(chosen / 1000)} km` : chosen >= 1 ? `${number(chosen)} m` : `${number(chosen, 2)} m`;
  }

  return { box, update, where };
}

export function fillWhere(where, origin, name, point, height, value) {
  if (!point) return where.replaceChildren();
  const [e, n, up] = [origin[0] + point.x, origin[1] + point.y, origin[2] + point.z / height];
  where.replaceChildren(element("b", { text: name }), value ? `  ${value}` : "", element("br"), `E ${number(e)}  N ${number(n)}  up ${number(up)} m`);
}

export function fillLegend(legend, data, field) {
  if (!field) {
    const rows = ["conflicting", "undetermined", "consistent"].filter((word) => data.faults.some(({ verdict }) => verdict === word)).map((word) => {
      const swatch = element("i");
      swatch.style.background = `var(--${word}, ${data.colours[word]})`;
      return element("div", {}, swatch, word);
    });
    return legend.replaceChildren(...rows);
  }
  const bar = element("div", { class: "sv-bar" });
  bar.style.background = `linear-gradient(90deg, ${stops(field).join(",")})`;
  const unit = field.unit === "°" ? "°" : "";
  const ends = [field.low, (field.low + field.high) / 2, field.high].map((value) => element("span", { text: `${number(value, Number.isInteger(value) ? 0 : 1).replace("-", "−")}${unit}` }));
  const title = field.unit && field.unit !== "°" ? `${field.title}, ${field.unit}` : field.title;
  legend.replaceChildren(element("div", { text: title }), bar, element("div", { class: "sv-ends" }, ...ends));
}
