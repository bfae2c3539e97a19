// Names over the picture: of faults in conflict and of the one that is picked. One that would cover an earlier one is left out.

import { Vector3 } from "three";
import { element } from "./panel.js";

const MOST = 14;

export function makeNames(data, place) {
  const box = element("div", { class: "sv-names", "aria-hidden": "true" });
  place.append(box);
  const labels = new Map();
  const wanted = data.faults.flatMap(({ verdict }, fault) => (verdict === "conflicting" ? [fault] : [])).slice(0, MOST);

  const labelOf = (fault) => {
    if (!labels.has(fault)) {
      const made = element("bdi", { text: data.faults[fault].short, class: data.faults[fault].verdict });
      box.append(made);
      labels.set(fault, { made, width: made.offsetWidth, height: made.offsetHeight });
    }
    return labels.get(fault);
  };

  function update(camera, state, section) {
    const taken = [];
    const [width, height] = [place.clientWidth, place.clientHeight];
    const order = state.picked === null ? wanted : [state.picked, ...wanted.filter((fault) => fault !== state.picked)];
    for (const { made } of labels.values()) made.hidden = true;
    for (const fault of order) {
      const top = new Vector3(...data.faults[fault].top);
      top.z *= state.height;
      if (!state.shown[fault] || !section.keeps(top, state.height)) continue;
      const { made, width: wide, height: tall } = labelOf(fault);
      top.project(camera);
      const x = ((top.x + 1) / 2) * width;
      const y = ((1 - top.y) / 2) * height - tall - 4;
      const mine = [x - wide / 2 - 3, y - 2, x + wide / 2 + 3, y + tall + 2];
      if (mine[0] < 0 || mine[1] < 36 || mine[2] > width || mine[3] > height - 56 || taken.some((other) => mine[0] < other[2] && other[0] < mine[2] && mine[1] < other[3] && other[1] < mine[3])) continue;
      taken.push(mine);
      made.hidden = false;
      made.classList.toggle("picked", fault === state.picked);
      made.style.transform = `translate(${(x - wide / 2).toFixed(1)}px, ${y.toFixed(1)}px)`;
    }
  }

  return { update };
}
