// Which triangle lies under a point of the picture. Each fault has a tree of its own, made when it is first wanted.

import { Box3, DoubleSide, Matrix4, Raycaster, Vector2, Vector3 } from "three";
import { MeshBVH, SAH, CENTER } from "three-mesh-bvh";

const LARGE = 2_000; // triangles of a fault; beyond, the quicker way to build pays

export function makePicker(data, mesh, camera) {
  const { begin } = mesh.userData;
  const caster = new Raycaster();
  const trees = data.faults.map(() => null);
  const boxes = data.faults.map(({ low, step }) => new Box3(new Vector3(...low), new Vector3(...low.map((value, k) => value + data.steps * step[k]))).expandByScalar(1e-3));

  function tree(fault) {
    const count = begin[fault + 1] - begin[fault];
    return (trees[fault] ??= new MeshBVH(mesh.geometry, { strategy: count > LARGE ? CENTER : SAH, indirect: true, setBoundingBox: false, range: { start: 3 * begin[fault], count: 3 * count } }));
  }

  // x and y run from -1 to 1; returns { fault, triangle, point } or null. `shown` says which faults are drawn, `kept` whether a point is.
  function at(x, y, shown, kept) {
    camera.updateMatrixWorld();
    mesh.updateWorldMatrix(true, false);
    caster.setFromCamera(new Vector2(x, y), camera);
    const ray = caster.ray.clone().applyMatrix4(new Matrix4().copy(mesh.matrixWorld).invert());
    let best = null;
    for (let fault = 0; fault < trees.length; fault++) {
      if (!shown[fault] || begin[fault] === begin[fault + 1] || !ray.intersectsBox(boxes[fault])) continue;
      for (const { faceIndex, point } of tree(fault).raycast(ray, DoubleSide)) {
        const place = point.clone().applyMatrix4(mesh.matrixWorld);
        const far = place.distanceTo(caster.ray.origin);
        if ((best === null || far < best.far) && kept(place)) best = { fault, triangle: faceIndex, point: place, far };
      }
    }
    return best;
  }

  return { at, work: (fault) => void tree(fault), count: trees.length };
}
