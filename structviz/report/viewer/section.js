// The section: a plane across easting, northing or depth that takes away what lies beyond it.

import { Plane, Vector3 } from "three";

export const AXES = [["", "none"], ["0", "across easting"], ["1", "across northing"], ["2", "level"]];

export function makeSection({ low, high }) {
  const plane = new Plane();
  let axis = null;
  let share = 1;

  const height = () => (axis === null ? null : low[axis] + share * (high[axis] - low[axis]));

  return {
    set(text, value) {
      axis = text === "" ? null : Number(text);
      share = value;
    },
    // Where the plane stands, in metres from the origin, and how it cuts a model that is `raised` so many times.
    at: height,
    planes(raised) {
      if (axis === null) return [];
      const normal = new Vector3().setComponent(axis, -1);
      plane.set(normal, height() * (axis === 2 ? raised : 1));
      return [plane];
    },
    keeps: (point, raised) => axis === null || point.getComponent(axis) <= height() * (axis === 2 ? raised : 1) + 1e-6,
    axis: () => axis,
  };
}
