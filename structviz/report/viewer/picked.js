// What stands out once a fault is chosen: its surface shines through what is before it, with its declared and predicted slip as arrows.

import { BufferAttribute, BufferGeometry, DoubleSide, Group, Mesh, MeshBasicMaterial, Vector3 } from "three";

const SHAFT = 0.028; // half-width of a shaft, of the length of its arrow
const HEAD = 0.11;
const NECK = 0.7;

export function makePicked(data, mesh, theme) {
  const { begin } = mesh.userData;
  const group = new Group();
  const ghost = new MeshBasicMaterial({ vertexColors: true, side: DoubleSide, transparent: true, opacity: 0.4, depthTest: false, depthWrite: false });
  const inks = { declared: theme.paints(arrowMaterial(), "ink"), predicted: theme.paints(arrowMaterial(), "sigma3") };
  const state = { tips: [] };

  // Returns nothing; null lets go.
  function show(fault) {
    for (const old of [...group.children]) {
      group.remove(old);
      old.geometry.dispose();
    }
    state.tips = [];
    if (fault === null) return;
    group.add(surface(fault));
    for (const [which, length] of [["predicted", 0.5], ["declared", 0.42]]) {
      const { [which]: along, place, normal, size, says } = data.faults[fault];
      if (!along) continue;
      const made = arrows([[place, along, normal, length * size]], inks[which]);
      made.renderOrder = which === "declared" ? 8 : 7;
      group.add(made);
      state.tips.push({ text: says[which], kind: `slip ${which}`, place: new Vector3(...place).addScaledVector(new Vector3(...along), length * size) });
    }
  }

  function surface(fault) {
    const geometry = new BufferGeometry();
    for (const name of ["position", "color"]) geometry.setAttribute(name, mesh.geometry.getAttribute(name));
    geometry.setDrawRange(3 * begin[fault], 3 * (begin[fault + 1] - begin[fault]));
    const made = new Mesh(geometry, ghost);
    made.frustumCulled = false;
    made.renderOrder = 5;
    return made;
  }

  return { group, show, state, materials: [ghost] };
}

const arrowMaterial = () => new MeshBasicMaterial({ side: DoubleSide, depthTest: false, transparent: true });

// Flat arrows in the planes of their faults, each [tail, direction, normal, length], as one mesh.
export function arrows(list, material) {
  const points = list.flatMap(([tail, along, normal, length]) => outline(new Vector3(...tail), new Vector3(...along), new Vector3(...normal), length));
  const geometry = new BufferGeometry();
  geometry.setAttribute("position", new BufferAttribute(Float32Array.from(points), 3));
  return new Mesh(geometry, material);
}

function outline(tail, along, normal, length) {
  const across = new Vector3().crossVectors(along, normal).normalize();
  const at = (forward, aside) => [...tail.clone().addScaledVector(along, forward * length).addScaledVector(across, aside * length)];
  const [a, b, c, d] = [at(0, -SHAFT), at(0, SHAFT), at(NECK, SHAFT), at(NECK, -SHAFT)];
  return [...a, ...b, ...c, ...a, ...c, ...d, ...at(NECK, -HEAD), ...at(NECK, HEAD), ...at(1, 0)];
}

export const flatMaterial = (theme, name) => theme.paints(new MeshBasicMaterial({ side: DoubleSide }), name);
