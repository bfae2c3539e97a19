// The model as objects to draw: all faults as one mesh, horizons, glyphs, slip lines, arrows and the frame.

import {
  BufferAttribute, BufferGeometry, DoubleSide, Group, InstancedMesh, LineBasicMaterial, LineSegments, Matrix4, Mesh,
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
  mesh.frustumCulled = false; // one mesh is the whole model: its bounds are not worth their time
  mesh.userData = { begin: starts(data.faults), cornerOf };
  return mesh;
}

export function lines(points, material, order = 0) {
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(Float32Array.from(points), 3));
  const made = new LineSegments(geometry, material);
  made.renderOrder = order;
  return made;
}

export function horizonMesh(data, arrays, theme) {
  if (!data.horizons.length) return null;
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(unpack(data.horizons, arrays["horizons.places"], arrays["horizons.corners"]).positions, 3));
  const material = new MeshLambertMaterial({ side: DoubleSide, flatShading: true, transparent: true, opacity: 0.15, depthWrite: false });
  return new Mesh(geometry, theme.paints(material, "horizon"));
}

// The shapes and colours that all glyphs share.
export function glyphParts(data, arrays, theme) {
  return data.glyphParts.map(({ role }, number) => {
    const geometry = new BufferGeometry();
    geometry.setAttribute("position", new BufferAttribute(arrays[`glyph.${number}.vertices`], 3));
    geometry.setIndex(new BufferAttribute(arrays[`glyph.${number}.triangles`], 1));
    geometry.computeVertexNormals();
    return { geometry, material: theme.paints(new MeshLambertMaterial(), role) };
  });
}

// A layer of glyphs, each an instance of the shared shapes; `raise` puts them at their places once heights are exaggerated.
export function glyphGroup(glyphs, parts) {
  const group = new Group();
  for (const { geometry, material } of parts) group.add(new InstancedMesh(geometry, material, glyphs.length));
  group.userData.raise = (height) => {
    glyphs.forEach(({ place, axes, size }, k) => {
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

// Arrows of slip at the middle of each fault, a little off its surface: [tail, direction, normal, length].
export function slipArrows(data, which) {
  return data.faults.flatMap(({ [which]: along, place, normal, size }) => (along ? [[place.map((value, k) => value + 0.02 * size * normal[k]), along, normal, 0.35 * size]] : []));
}

export function striaLines(data, length) {
  return data.striae.flatMap(({ place, along }) => [-1, 1].flatMap((side) => place.map((value, k) => value + (side * length * along[k]) / 2)));
}

// The floor of the frame and its posts.
export function frameLines({ low, high }) {
  const [w, s, b] = low;
  const [e, n, t] = high;
  const floor = [[w, s, b], [e, s, b], [e, n, b], [w, n, b]];
  return floor.flatMap((corner, k) => [...corner, ...floor[(k + 1) % 4], ...corner, corner[0], corner[1], t]);
}

export const lineMaterial = (theme, name, settings = {}) => theme.paints(new LineBasicMaterial(settings), name);
