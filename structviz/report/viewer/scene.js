// The model as objects to draw: all faults as one mesh, their rims, horizons, glyphs, slip lines and arrows.

import {
  BufferAttribute, BufferGeometry, Color, DoubleSide, Group, InstancedMesh, LineBasicMaterial, LineSegments, Matrix4, Mesh,
  MeshLambertMaterial, Vector3,
} from "three";
import { starts, unpack } from "./data.js";

export function faultMesh(data, arrays) {
  const geometry = new BufferGeometry();
  const positions = unpack(data.faults, arrays["faults.places"], arrays["faults.corners"]);
  geometry.setAttribute("position", new BufferAttribute(positions, 3));
  geometry.setAttribute("color", new BufferAttribute(new Uint8Array((positions.length / 3) * 4), 4, true));
  const material = new MeshLambertMaterial({ vertexColors: true, side: DoubleSide, flatShading: true, alphaTest: 0.5 });
  const mesh = new Mesh(geometry, material);
  mesh.userData.begin = starts(data.faults);
  return mesh;
}

// Edges that belong to one triangle of a fault only.
export function rimOf(positions, from, to) {
  const seen = new Map();
  const key = (at) => `${positions[at]},${positions[at + 1]},${positions[at + 2]}`;
  for (let triangle = from; triangle < to; triangle++) {
    const corners = [0, 3, 6].map((k) => 9 * triangle + k);
    const names = corners.map(key);
    for (let k = 0; k < 3; k++) {
      const next = (k + 1) % 3;
      const edge = names[k] < names[next] ? `${names[k]}|${names[next]}` : `${names[next]}|${names[k]}`;
      seen.set(edge, seen.has(edge) ? null : [corners[k], corners[next]]);
    }
  }
  const points = [];
  for (const ends of seen.values()) if (ends) for (const at of ends) points.push(positions[at], positions[at + 1], positions[at + 2]);
  return new Float32Array(points);
}

export function lines(points, colour, order = 0) {
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(points, 3));
  const made = new LineSegments(geometry, new LineBasicMaterial({ color: colour }));
  made.renderOrder = order;
  return made;
}

export function horizonMesh(data, arrays, colour) {
  if (!data.horizons.length) return null;
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(unpack(data.horizons, arrays["horizons.places"], arrays["horizons.corners"]), 3));
  const material = new MeshLambertMaterial({ color: colour, side: DoubleSide, flatShading: true, transparent: true, opacity: 0.28, depthWrite: false });
  return new Mesh(geometry, material);
}

// Every glyph as an instance of one shape a part; `raise` puts each at its place once heights are exaggerated.
export function glyphGroup(data, arrays, colours) {
  const group = new Group();
  data.glyphParts.forEach(({ role }, number) => {
    const geometry = new BufferGeometry();
    geometry.setAttribute("position", new BufferAttribute(arrays[`glyph.${number}.vertices`], 3));
    geometry.setIndex(new BufferAttribute(arrays[`glyph.${number}.triangles`], 1));
    geometry.computeVertexNormals();
    group.add(new InstancedMesh(geometry, new MeshLambertMaterial({ color: colours[role] }), data.glyphs.length));
  });
  group.userData.raise = (height) => {
    data.glyphs.forEach(({ place, axes, size }, k) => {
      const matrix = new Matrix4().makeBasis(...axes.map((axis) => new Vector3(...axis).multiplyScalar(size)));
      if (matrix.determinant() < 0) matrix.makeBasis(...axes.map((axis, n) => new Vector3(...axis).multiplyScalar(n === 1 ? -size : size)));
      matrix.setPosition(place[0], place[1], place[2] * height);
      for (const part of group.children) part.setMatrixAt(k, matrix);
    });
    for (const part of group.children) {
      part.instanceMatrix.needsUpdate = true;
      part.computeBoundingSphere();
    }
  };
  group.userData.raise(1);
  return group;
}

// Arrows of slip at the middle of each fault: declared on one line, predicted beside it; and measured slip lines.
export function slipLines(data, which) {
  const points = [];
  for (const fault of data.faults) {
    if (!fault[which]) continue;
    const place = new Vector3(...fault.place).addScaledVector(new Vector3(...fault.normal), 0.02 * fault.size);
    arrow(points, place, new Vector3(...fault[which]), new Vector3(...fault.normal), 0.35 * fault.size);
  }
  return new Float32Array(points);
}

function arrow(points, tail, along, normal, length) {
  const tip = tail.clone().addScaledVector(along, length);
  const across = new Vector3().crossVectors(along, normal);
  points.push(...tail, ...tip);
  for (const side of [1, -1]) points.push(...tip, ...tip.clone().addScaledVector(along, -0.28 * length).addScaledVector(across, 0.13 * length * side));
}

export function striaLines(data, length) {
  const points = data.striae.flatMap(({ place, along }) => [-1, 1].flatMap((side) => place.map((value, k) => value + (side * length * along[k]) / 2)));
  return new Float32Array(points);
}

// The floor of the frame and its posts.
export function frameLines({ low, high }) {
  const [w, s, b] = low;
  const [e, n, t] = high;
  const floor = [[w, s, b], [e, s, b], [e, n, b], [w, n, b]];
  const points = floor.flatMap((corner, k) => [...corner, ...floor[(k + 1) % 4], ...corner, corner[0], corner[1], t]);
  return new Float32Array(points);
}

export const asColour = (text) => new Color(text.trim());
