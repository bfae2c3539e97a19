// What can be shown and hidden over the faults, each with its line in the list of layers.

import { Group } from "three";
import { placesOf } from "./data.js";
import { arrows, flatMaterial } from "./picked.js";
import { frameLines, glyphGroup, glyphParts, horizonMesh, lineMaterial, lines, slipArrows, striaLines } from "./scene.js";

// Returns the layers in the order of their list: { key, label, object, on, heading?, glyphs? }; those without anything are left out.
export function makeLayers(data, arrays, theme, size) {
  const parts = glyphParts(data, arrays, theme);
  const glyphs = data.glyphs.map(({ key, title, glyphs: held, shown }) => ({ key, label: title, object: glyphGroup(held, parts), on: shown, glyphs: held }));
  const made = (key, label, object, on) => ({ key, label, object, on });
  const drawn = (points, name, order) => (points.length ? lines(points, lineMaterial(theme, name), order) : null);
  const slips = (which, name) => (data.faults.some((fault) => fault[which]) ? arrows(slipArrows(data, which), flatMaterial(theme, name)) : null);
  const met = data.meetings ? drawn(placesOf(data.meetings, arrays.meetings), "ink", 2) : null;
  const others = [
    made("meetings", "Lines where faults meet", met, true),
    made("horizons", "Horizons", horizonMesh(data, arrays, theme), true),
    made("striae", "Measured slip lines", drawn(striaLines(data, 0.03 * size), "sigma2", 2), true),
    made("declared", "Declared slip (dark)", slips("declared", "ink"), false),
    made("predicted", "Predicted slip (ochre)", slips("predicted", "sigma3"), false),
    made("frame", "Frame", drawn(frameLines(data), "faint", 0), true),
  ];
  const all = [...glyphs, ...others.filter(({ object }) => object)];
  for (const layer of all) layer.object.visible = layer.on;
  return all;
}

// Groups of what stretches with heights, and of glyphs, which keep their shape and only change place.
export function grouped(layers) {
  const stretched = new Group();
  const upright = new Group();
  for (const { object, glyphs } of layers) (glyphs ? upright : stretched).add(object);
  return { stretched, upright };
}
