// The model as objects to draw: all faults as one mesh, their rims, horizons, glyphs, slip lines and arrows.

import {
  BufferAttribute, BufferGeometry, Color, DoubleSide, Group, InstancedMesh, LineBasicMaterial, LineSegments, Matrix4, Mesh,
  MeshLambertMaterial, Vector3,
} from "three";
import { starts, unpack } from "./data.js";

export function faultMesh(data, arrays) {
  const geometry = new BufferGeometry();
  const { positions, cornerOf } = unpack(data.faults, arrays["faults.places"], arrays["faults.corners"]);
  geometry.setAttribute("position", new BufferAttribute(positions, 3));
  geometry.setAttribute("color", new BufferAttribute(new Uint8Array((positions.length / 3) * 4), 4, true));
  const material = new MeshLambertMaterial({ vertexColors: true, side: DoubleSide, flatShading: true, alphaTest: 0.5, polygonOffset: true, polygonOffsetFactor: 1, polygonOffsetUnits: 1 });
  const mesh = new Mesh(geometry, material);
  mesh.userData = { begin: starts(data.faults), cornerOf };
  return mesh;
}

// Edges that belong to one triangle only, of triangles `from` up to `to`, which are one surface.
export function rimOf(mesh, from, to) {
  const { cornerOf } = mesh.userData;
  const positions = mesh.geometry.getAttribute("position").array;
  const keys = new Float64Array(3 * (to - from));
  const key = (at) => {
    const [a, b] = [cornerOf[at], cornerOf[at % 3 === 2 ? at - 2 : at + 1]];
    return Math.min(a, b) * 4294967296 + Math.max(a, b);
  };
  for (let k = 0; k < keys.length; k++) keys[k] = key(3 * from + k);
  const once = alone(Float64Array.from(keys).sort());
  const points = [];
  keys.forEach((value, k) => {
    if (!once.has(value)) return;
    const at = 3 * from + k;
    for (const end of [at, at % 3 === 2 ? at - 2 : at + 1]) points.push(positions[3 * end], positions[3 * end + 1], positions[3 * end + 2]);
  });
  return points;
}

const alone = (sorted) => new Set(sorted.filter((value, k) => value !== sorted[k - 1] && value !== sorted[k + 1]));

export function lines(points, colour, order = 0) {
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(Float32Array.from(points), 3));
  const made = new LineSegments(geometry, new LineBasicMaterial({ color: colour }));
  made.renderOrder = order;
  return made;
}

export function horizonMesh(data, arrays, colour) {
  if (!data.horizons.length) return null;
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(unpack(data.horizons, arrays["horizons.places"], arrays["horizons.corners"]).positions, 3));
  const material = new MeshLambertMaterial({ color: colour, side: DoubleSide, flatShading: true, transparent: true, opacity: 0.15, depthWrite: false });
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
  return points;
}

function arrow(points, tail, along, normal, length) {
  const tip = tail.clone().addScaledVector(along, length);
  const across = new Vector3().crossVectors(along, normal);
  points.push(...tail, ...tip);
  for (const side of [1, -1]) points.push(...tip, ...tip.clone().addScaledVector(along, -0.28 * length).addScaledVector(across, 0.13 * length * side));
}

export function striaLines(data, length) {
  return data.striae.flatMap(({ place, along }) => [-1, 1].flatMap((side) => place.map((value, k) => value + (side * length * along[k]) / 2)));
}

// The floor of the frame and its posts.
export function frameLines({ low, high }) {
  const [w, s, b] = low;
  const [e, n, t] = high;
  const floor = [[w, s, b], [e, s, b], [e, n, b], [w, n, b]];
  const points = floor.flatMap((corner, k) => [...corner, ...floor[(k + 1) % 4], ...corner, corner[0], corner[1], t]);
  return points;
}

export const asColour = (text) => new Color(text.trim());
