// The camera: parallel, so that lengths compare; turned by OrbitControls, flown to places and named views.

import { Box3, OrthographicCamera, Vector3 } from "three";
import { OrbitControls } from "three/examples/jsm/controls/OrbitControls.js";

const calm = matchMedia("(prefers-reduced-motion: reduce)");
const FLIGHT_MS = 520;

export function makeCamera(element, data, redraw) {
  const low = new Vector3(...data.low);
  const high = new Vector3(...data.high);
  const middle = low.clone().add(high).multiplyScalar(0.5);
  const size = Math.max(low.distanceTo(high), 1);
  const camera = new OrthographicCamera(-1, 1, 1, -1, 0, 8 * size);
  camera.up.set(0, 0, 1);
  const controls = new OrbitControls(camera, element);
  controls.enableDamping = false;
  controls.zoomToCursor = true;
  controls.addEventListener("change", redraw);
  let flight = 0;

  function resize(width, height) {
    const half = size / 2;
    const aspect = width / Math.max(height, 1);
    Object.assign(camera, aspect > 1 ? { left: -half * aspect, right: half * aspect, top: half, bottom: -half } : { left: -half, right: half, top: half / aspect, bottom: -half / aspect });
    camera.updateProjectionMatrix();
  }

  const away = (azimuth, elevation) => {
    const a = (azimuth * Math.PI) / 180;
    const up = (Math.min(elevation, 89.99) * Math.PI) / 180;
    return new Vector3(Math.cos(up) * Math.sin(a), Math.cos(up) * Math.cos(a), Math.sin(up));
  };

  // Zoom at which a box fills the picture as seen from a direction.
  function zoomFor(box, towards) {
    const right = new Vector3().crossVectors(camera.up, towards).normalize();
    const above = new Vector3().crossVectors(towards, right);
    const span = box.getSize(new Vector3());
    const extent = (axis) => Math.abs(span.x * axis.x) + Math.abs(span.y * axis.y) + Math.abs(span.z * axis.z);
    const across = Math.max(extent(right), 0.02 * size);
    const tall = Math.max(extent(above), 0.02 * size);
    return 0.92 * Math.min((camera.right - camera.left) / across, (camera.top - camera.bottom) / tall);
  }

  function place(target, towards, zoom) {
    controls.target.copy(target);
    camera.position.copy(target).addScaledVector(towards, 4 * size);
    camera.zoom = zoom;
    camera.updateProjectionMatrix();
    controls.update();
    redraw();
  }

  function fly(target, towards, zoom) {
    cancelAnimationFrame(flight);
    if (calm.matches) return place(target, towards, zoom);
    const from = { target: controls.target.clone(), towards: camera.position.clone().sub(controls.target).normalize(), zoom: camera.zoom };
    const began = performance.now();
    const step = (now) => {
      const t = Math.min(1, Math.max(0, (now - began) / FLIGHT_MS));
      const k = t * t * (3 - 2 * t);
      const direction = from.towards.clone().lerp(towards, k);
      if (direction.lengthSq() < 1e-6) direction.copy(towards);
      place(from.target.clone().lerp(target, k), direction.normalize(), from.zoom * (zoom / from.zoom) ** k);
      if (t < 1) flight = requestAnimationFrame(step);
    };
    flight = requestAnimationFrame(step);
  }

  const whole = (height) => new Box3(new Vector3(low.x, low.y, low.z * height), new Vector3(high.x, high.y, high.z * height));
  const see = (azimuth, elevation, box, go = fly) => {
    const towards = away(azimuth, elevation);
    go(box.getCenter(new Vector3()), towards, zoomFor(box, towards));
  };

  return {
    camera, controls, resize, see, place, whole, middle, size,
    // Keeps the direction of view and brings a box to the middle, with room around it.
    visit(box) {
      const towards = camera.position.clone().sub(controls.target).normalize();
      fly(box.getCenter(new Vector3()), towards, Math.min(zoomFor(box, towards) * 0.32, 6 * zoomFor(whole(1), towards)));
    },
    turn(azimuth, elevation) {
      const towards = camera.position.clone().sub(controls.target).normalize();
      const a = (Math.atan2(towards.x, towards.y) * 180) / Math.PI + azimuth;
      const up = (Math.asin(Math.max(-1, Math.min(1, towards.z))) * 180) / Math.PI + elevation;
      place(controls.target.clone(), away(a, Math.max(-89, up)), camera.zoom);
    },
    zoom: (factor) => place(controls.target.clone(), camera.position.clone().sub(controls.target).normalize(), camera.zoom * factor),
    stop: () => cancelAnimationFrame(flight),
  };
}
