// Rims of surfaces: edges that belong to one triangle only. Worked out for one fault at a time, when there is time.

import { Group } from "three";
import { lineMaterial, lines } from "./scene.js";

// Points of the rim of triangles `from` up to `to`, which are one surface.
export function rimOf(mesh, from, to) {
  const { cornerOf } = mesh.userData;
  const positions = mesh.geometry.getAttribute("position").array;
  const keys = new Float64Array(3 * (to - from));
  for (let k = 0; k < keys.length; k++) {
    const at = 3 * from + k;
    const [a, b] = [cornerOf[at], cornerOf[next(at)]];
    keys[k] = Math.min(a, b) * 4294967296 + Math.max(a, b);
  }
  const once = alone(Float64Array.from(keys).sort());
  const points = [];
  for (let k = 0; k < keys.length; k++) {
    if (!once.has(keys[k])) continue;
    const at = 3 * from + k;
    for (const end of [at, next(at)]) points.push(positions[3 * end], positions[3 * end + 1], positions[3 * end + 2]);
  }
  return points;
}

const next = (at) => (at % 3 === 2 ? at - 2 : at + 1);
const alone = (sorted) => new Set(sorted.filter((value, k) => value !== sorted[k - 1] && value !== sorted[k + 1]));

// All rims as three sets of lines, and the outline of one fault; rims of conflicts shine through what stands before them.
export function makeRims(data, mesh, theme, redraw) {
  const { begin } = mesh.userData;
  const found = data.faults.map(() => null);
  const group = new Group();
  const looks = {
    consistent: lineMaterial(theme, "ink", { transparent: true, opacity: 0.35 }),
    undetermined: lineMaterial(theme, "ink", { transparent: true, opacity: 0.35 }),
    conflicting: lineMaterial(theme, "conflicting", { transparent: true, opacity: 0.9, depthTest: false }),
  };
  const chosen = lineMaterial(theme, "ink", { transparent: true, depthTest: false });
  let outline = null;
  let complete = false;

  const rim = (fault) => (found[fault] ??= rimOf(mesh, begin[fault], begin[fault + 1]));
  const drop = (object) => {
    object.parent.remove(object);
    object.geometry.dispose();
  };

  function draw(shown) {
    for (const old of group.children.filter((each) => each !== outline)) drop(old);
    for (const [word, material] of Object.entries(looks)) {
      const points = data.faults.flatMap((fault, k) => (fault.verdict === word && shown[k] && (complete || word === "conflicting") ? rim(k) : []));
      if (points.length) group.add(lines(points, material, word === "conflicting" ? 4 : 0));
    }
    redraw();
  }

  return {
    group,
    draw,
    materials: [...Object.values(looks), chosen],
    count: data.faults.length,
    work: (fault) => void rim(fault),
    finish(shown) {
      complete = true;
      draw(shown);
    },
    outline(fault) {
      if (outline) drop(outline);
      outline = fault === null ? null : lines(rim(fault), chosen, 5);
      if (outline) group.add(outline);
      redraw();
    },
  };
}
