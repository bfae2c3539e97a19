// Words over the picture: names of faults in conflict and of the one that is picked, of stresses, and coordinates of the frame.
// What would cover something earlier is left out.

import { Vector3 } from "three";
import { element, number } from "./panel.js";

const MOST = 14;

export function makeNames(data, place) {
  const box = element("div", { class: "sv-names", "aria-hidden": "true" });
  place.append(box);
  const labels = new Map();
  const wanted = data.faults.flatMap(({ verdict }, fault) => (verdict === "conflicting" ? [fault] : [])).slice(0, MOST);
  const stresses = data.glyphs.flatMap(({ key, glyphs }) => glyphs.filter(({ label }) => label).map((glyph) => ({ layer: key, ...glyph })));

  const labelOf = (text, kind) => {
    const key = `${kind} ${text}`;
    if (!labels.has(key)) {
      const made = element("bdi", { text, class: kind });
      box.append(made);
      labels.set(key, { made, text, kind, width: made.offsetWidth, height: made.offsetHeight });
      made.hidden = true;
    }
    return labels.get(key);
  };

  function candidates(camera, state, section, visible, tips) {
    const order = state.picked === null ? wanted : [state.picked, ...wanted.filter((fault) => fault !== state.picked)];
    const faults = order.map((fault) => {
      const at = raised(data.faults[fault].top, state.height);
      return state.shown[fault] && section.keeps(at, state.height) ? { text: data.faults[fault].short, kind: data.faults[fault].verdict, at, picked: fault === state.picked } : null;
    });
    const glyphs = stresses.filter(({ layer }) => visible(layer)).map(({ label, place: at, size }) => ({ text: label, kind: "stress", at: raised(at, state.height).add(new Vector3(0, 0, 1.2 * size)) }));
    const slips = tips.map(({ text, kind, place: at }) => ({ text, kind, at: raised([...at], state.height) }));
    const [first, ...rest] = faults.filter(Boolean);
    return [...(first ? [first] : []), ...slips, ...rest, ...glyphs, ...(visible("frame") ? corners(data, camera, state.height) : [])];
  }

  // Shows what fits; `kept` are the words as they stand, for a saved picture.
  const kept = [];
  function update(camera, state, section, visible, tips) {
    kept.length = 0;
    const [width, height] = [place.clientWidth, place.clientHeight];
    for (const { made } of labels.values()) made.hidden = true;
    for (const { text, kind, at, picked, under } of candidates(camera, state, section, visible, tips)) {
      const { made, width: wide, height: tall } = labelOf(text, kind);
      const seen = at.project(camera);
      const centre = ((seen.x + 1) / 2) * width;
      const inside = under === undefined ? centre : Math.min(Math.max(centre, wide / 2 + 5), width - wide / 2 - 5);
      const middle = ((1 - seen.y) / 2) * height;
      const [above, below] = [[inside, middle - tall - 4], [inside, middle + 3]];
      const beside = [1, -1].map((side) => [centre + side * (wide / 2 + 12), middle - tall / 2]);
      const places = kind.startsWith("slip") ? [above, below, ...beside] : [under ? below : above];
      const found = places.find(([left, top]) => free(room(left, top, wide, tall), width, height));
      if (!found) continue;
      const [x, y] = found;
      made.hidden = false;
      made.classList.toggle("picked", Boolean(picked));
      made.style.transform = `translate(${(x - wide / 2).toFixed(1)}px, ${y.toFixed(1)}px)`;
      kept.push({ text, kind, x, y, wide, tall, taken: room(x, y, wide, tall) });
    }
  }

  const room = (x, y, wide, tall) => [x - wide / 2 - 3, y - 2, x + wide / 2 + 3, y + tall + 2];
  const free = ([left, top, right, bottom], width, height) => left >= 0 && top >= 36 && right <= width && bottom <= height - 56 && !kept.some(({ taken: [l, t, r, b] }) => left < r && l < right && top < b && t < bottom);

  // Letters may be of another size than when a word was measured.
  function measure() {
    for (const label of labels.values()) {
      label.made.hidden = false;
      Object.assign(label, { width: label.made.offsetWidth, height: label.made.offsetHeight });
    }
  }

  return { update, measure, kept };
}

const raised = ([x, y, z], height) => new Vector3(x, y, z * height);

// Real coordinates at the ends of the two near edges of the floor, and of the post between them.
function corners({ low, high, origin }, camera, height) {
  const towards = new Vector3(0, 0, 1).applyQuaternion(camera.quaternion);
  const [near, far] = [0, 1].map((k) => (towards.getComponent(k) > 0 ? [high[k], low[k]] : [low[k], high[k]])).reduce(([a, b], [one, other]) => [[...a, one], [...b, other]], [[], []]);
  const word = (letter, axis, value) => `${letter} ${number(origin[axis] + value)}`;
  const floor = low[2] * height;
  const made = (text, x, y, z) => ({ text, kind: "coordinate", at: new Vector3(x, y, z), under: z === floor });
  const found = [
    made(word("E", 0, far[0]), far[0], near[1], floor), made(word("N", 1, far[1]), near[0], far[1], floor),
    made(`${word("E", 0, near[0])}  ${word("N", 1, near[1])}`, near[0], near[1], floor),
  ];
  if (towards.z < 0.98) found.push(made(`${word("up", 2, high[2])} m`, far[0], near[1], high[2] * height));
  return found;
}
