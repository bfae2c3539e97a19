// Which triangle lies under a point of the picture. The tree is built once, after the first picture.

import { Raycaster, Vector2, Vector3 } from "three";
import { MeshBVH, SAH, CENTER, acceleratedRaycast } from "three-mesh-bvh";

const LARGE = 100_000; // triangles; beyond, the quicker way to build pays

export function makePicker(mesh, camera) {
  const ray = new Raycaster();
  const begin = mesh.userData.begin;
  mesh.raycast = acceleratedRaycast;

  function build() {
    if (!mesh.geometry.boundsTree) mesh.geometry.boundsTree = new MeshBVH(mesh.geometry, { strategy: begin.at(-1) > LARGE ? CENTER : SAH, indirect: true });
  }

  // x and y run from -1 to 1; returns { fault, triangle, point } or null. `seen` says whether a hit is drawn.
  function at(x, y, seen) {
    build();
    camera.updateMatrixWorld();
    ray.setFromCamera(new Vector2(x, y), camera);
    const hits = ray.intersectObject(mesh, false);
    for (const { faceIndex, point } of hits) {
      const fault = faultOf(begin, faceIndex);
      if (seen(fault, point)) return { fault, triangle: faceIndex, point };
    }
    return null;
  }

  return { build, at };
}

// Row of the fault that a triangle belongs to, by halving.
export function faultOf(begin, triangle) {
  let low = 0;
  let high = begin.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (begin[middle] <= triangle) low = middle;
    else high = middle;
  }
  return low;
}

export const project = (point, camera) => new Vector3().copy(point).project(camera);
