// One view: what is shown, how it is coloured, and what the mouse, the fingers and the keys do.

import { AmbientLight, Box3, BufferAttribute, DirectionalLight, Group, Scene, Vector3, WebGLRenderer } from "three";
import { makeCamera } from "./camera.js";
import { NOTHING, paint, rgb } from "./colours.js";
import { fillLegend, fillWhere, makeFoot } from "./furniture.js";
import { choice, element, number, slider, STYLE, toggle } from "./panel.js";
import { makeNames } from "./names.js";
import { makePicker } from "./picking.js";
import { AXES, makeSection } from "./section.js";
import { faultMesh, frameLines, glyphGroup, horizonMesh, lines, rimOf, slipLines, striaLines } from "./scene.js";

const STILL = 5; // pixels that a click may wander
const POINTS = [["oblique", "Oblique"], ["map", "Map"], ["south", "From the south"], ["west", "From the west"], ["strike", "Along strike"]];

export function startView(place, data, arrays, tell) {
  const style = getComputedStyle(document.documentElement);
  const colour = (name, other) => style.getPropertyValue(`--${name}`).trim() || other;
  const renderer = new WebGLRenderer({ antialias: true, alpha: true, preserveDrawingBuffer: true });
  renderer.setPixelRatio(Math.min(devicePixelRatio, 2));
  renderer.localClippingEnabled = true;
  const canvas = renderer.domElement;
  canvas.tabIndex = 0;
  canvas.setAttribute("role", "application");
  canvas.setAttribute("aria-label", "The model in 3D: arrows turn it, plus and minus zoom, Escape lets go of a fault");
  place.replaceChildren(element("style", { text: STYLE }), canvas);

  const scene = new Scene();
  const model = new Group();
  const mesh = faultMesh(data, arrays);
  const begin = mesh.userData.begin;
  const state = { picked: null, height: 1, field: null, shown: data.faults.map(() => true), outline: null };
  const ink = colour("ink", "#22303c");
  const frame = lines(frameLines(data), colour("faint", "#9aa5ad"));
  const horizons = horizonMesh(data, arrays, colour("faint", "#9aa5ad"));
  const glyphs = data.glyphs.length ? glyphGroup(data, arrays, { lens: "#efe3c4", thumb: "#22303c" }) : null;
  const declared = lines(slipLines(data, "declared"), ink, 2);
  const predicted = lines(slipLines(data, "predicted"), colour("sigma3", "#d9a12b"), 3);
  const view = makeCamera(canvas, data, () => redraw());
  const striae = data.striae.length ? lines(striaLines(data, 0.03 * view.size), colour("sigma2", "#7a6a8e"), 2) : null;
  const movable = [mesh, horizons, declared, predicted, striae].filter(Boolean);
  declared.visible = predicted.visible = false;
  model.add(frame, ...movable);
  const lamp = new DirectionalLight("#ffffff", 1.5);
  scene.add(model, new AmbientLight("#ffffff", 1.6), lamp, lamp.target);
  if (glyphs) scene.add(glyphs);

  const section = makeSection(data);
  const picker = makePicker(mesh, view.camera);
  const foot = makeFoot();
  const names = makeNames(data, place);
  const legend = element("div", { class: "sv-panel sv-legend" });

  // --- drawing: only when something changed ---

  let waiting = 0;
  function redraw() {
    if (!waiting) waiting = requestAnimationFrame(draw);
  }
  function draw() {
    waiting = 0;
    lamp.position.copy(view.camera.position).add(new Vector3(0, 0, view.size));
    lamp.target.position.copy(view.controls.target);
    renderer.render(scene, view.camera);
    foot.update(view.camera, view.controls, place.clientWidth);
    names.update(view.camera, state, section);
  }
  function fit() {
    const [width, height] = [place.clientWidth, place.clientHeight];
    if (!width || !height) return;
    renderer.setSize(width, height, false);
    view.resize(width, height);
  }

  // --- what is shown ---

  function colourAll() {
    const verdictColours = data.faults.map(({ verdict }) => rgb(colour(verdict, data.colours[verdict])));
    const codes = state.field ? arrays[`field.${state.field.key}`] : null;
    const held = mesh.geometry.getAttribute("color");
    paint(held.array, { begin, shownFaults: state.shown, field: state.field, codes, verdictColours });
    held.needsUpdate = true;
    fillLegend(legend, data, state.field);
    drawRims();
  }
  // Rims of what is shown; those of conflicts shine through what stands before them.
  let rimsOf = null;
  const rims = new Group();
  model.add(rims);
  function drawRims() {
    for (const old of rims.children) old.geometry.dispose();
    rims.clear();
    if (rimsOf) {
      for (const [word, order] of [["consistent", 0], ["undetermined", 0], ["conflicting", 4]]) {
        const points = data.faults.flatMap((fault, k) => (fault.verdict === word && state.shown[k] ? rimsOf[k] : []));
        if (!points.length) continue;
        const made = lines(points, order ? colour("conflicting", data.colours.conflicting) : ink, order);
        Object.assign(made.material, { transparent: true, opacity: order ? 0.9 : 0.35, depthTest: !order, clippingPlanes: section.planes(state.height) });
        rims.add(made);
      }
    }
    redraw();
  }
  const boxOf = (fault) => {
    const { low, step } = data.faults[fault];
    const box = new Box3(new Vector3(...low), new Vector3(...low.map((value, k) => value + 65535 * step[k])));
    box.min.z *= state.height;
    box.max.z *= state.height;
    return box;
  };
  function outline(fault) {
    if (state.outline) {
      model.remove(state.outline);
      state.outline.geometry.dispose();
      state.outline = null;
    }
    if (fault !== null && state.shown[fault]) {
      state.outline = lines(rimOf(mesh, begin[fault], begin[fault + 1]), ink, 5);
      Object.assign(state.outline.material, { depthTest: false, transparent: true });
      state.outline.material.clippingPlanes = section.planes(state.height);
      model.add(state.outline);
    }
    redraw();
  }
  function cut(text, share) {
    section.set(text, share);
    const planes = section.planes(state.height);
    for (const object of [...movable, ...rims.children, state.outline].filter(Boolean)) object.material.clippingPlanes = planes;
    const at = section.at();
    where.output.textContent = at === null ? "" : `${number(data.origin[section.axis()] + at)} m`;
    where.input.disabled = at === null;
    redraw();
  }
  function exaggerate(height) {
    state.height = height;
    model.scale.z = height;
    model.updateMatrixWorld(true);
    glyphs?.userData.raise(height);
    tall.output.textContent = `× ${number(height, 1)}`;
    cut(across.select.value, Number(where.input.value));
  }

  // --- controls ---

  const colouring = choice("Colour", [["", "Verdict"], ...data.fields.map(({ key, title }) => [key, title])], (key) => {
    state.field = data.fields.find((field) => field.key === key) ?? null;
    colourAll();
  });
  const looking = choice("View", POINTS, look);
  const across = choice("Section", AXES, () => cut(across.select.value, Number(where.input.value)));
  const where = slider("at", { min: 0, max: 1, step: 0.002, value: 0.5, "aria-label": "Place of the section" }, (value) => cut(across.select.value, value));
  const tall = slider("Exaggeration", { min: 1, max: 10, step: 0.5, value: 1 }, exaggerate);
  const layer = (label, object, on) => (object ? [toggle(label, on, (value) => { object.visible = value; redraw(); })] : []);
  const simplified = data.tolerance > 0 ? `Drawn with ${number(data.triangles[1])} of ${number(data.triangles[0])} triangles; no point is moved by more than ${number(data.tolerance, 1)} m. The numbers rest on all of them.` : "";
  const inside = element("div", { class: "sv-inside" }, across.row, where.row, tall.row,
    ...layer("Stress glyphs", glyphs, true), ...layer("Horizons", horizons, true), ...layer("Measured slip lines", striae, true),
    ...layer("Declared slip (dark)", declared, false), ...layer("Predicted slip (ochre)", predicted, false), ...layer("Frame", frame, true),
    element("div", { class: "sv-note", text: "Exaggeration stretches heights alone: angles are then not true." }),
    ...(simplified ? [element("div", { class: "sv-note", text: simplified })] : []));
  const more = element("details", { class: "sv-more" }, element("summary", { text: "Section, layers" }), inside);
  const save = element("button", { type: "button", text: "Save picture", onclick: savePicture });
  place.append(element("div", { class: "sv-panel sv-top" }, colouring.row, looking.row, save, more), legend, foot.box);

  function look(name) {
    const strike = state.picked === null ? data.azimuth : data.faults[state.picked].strike;
    const places = { oblique: [data.azimuth, 34], map: [180, 90], south: [180, 4], west: [270, 4], strike: [strike + 180, 6] };
    const box = name === "strike" && state.picked !== null ? boxOf(state.picked).expandByScalar(0.06 * view.size) : view.whole(state.height);
    view.see(...places[name], box);
  }
  function savePicture() {
    draw();
    const whole = document.createElement("canvas");
    whole.width = canvas.width;
    whole.height = canvas.height;
    const pen = whole.getContext("2d");
    pen.fillStyle = colour("raised", "#ffffff");
    pen.fillRect(0, 0, whole.width, whole.height);
    pen.drawImage(canvas, 0, 0);
    whole.toBlob((blob) => {
      const link = element("a", { href: URL.createObjectURL(blob), download: "structviz-3d.png" });
      link.click();
      setTimeout(() => URL.revokeObjectURL(link.href), 5000);
    }, "image/png");
  }

  // --- the mouse, fingers and keys ---

  const under = (event) => {
    const box = canvas.getBoundingClientRect();
    const [x, y] = [((event.clientX - box.left) / box.width) * 2 - 1, 1 - ((event.clientY - box.top) / box.height) * 2];
    return picker.at(x, y, (fault, point) => state.shown[fault] && section.keeps(point, state.height));
  };
  let pressed = null;
  canvas.addEventListener("pointerdown", (event) => {
    view.stop();
    pressed = [event.clientX, event.clientY];
  });
  canvas.addEventListener("click", (event) => {
    if (pressed && Math.hypot(event.clientX - pressed[0], event.clientY - pressed[1]) > STILL) return;
    tell("pick", { fault: under(event)?.fault ?? null, from: "scene" });
  });
  let hovering = 0;
  let last = null;
  canvas.addEventListener("pointermove", (event) => {
    if (event.pointerType !== "mouse" || event.buttons || hovering) return;
    hovering = requestAnimationFrame(() => {
      hovering = 0;
      hover(under(event));
    });
  });
  canvas.addEventListener("pointerleave", () => hover(null));
  function hover(hit) {
    if (!hit && !last) return;
    last = hit;
    const values = hit ? valuesAt(hit.triangle) : null;
    const shown = hit && state.field ? `${state.field.title} ${values[state.field.title] ?? "not known"}` : "";
    fillWhere(foot.where, data.origin, hit ? data.faults[hit.fault].short : "", hit?.point, state.height, shown);
    canvas.style.cursor = hit ? "pointer" : "";
    tell("hover", { fault: hit?.fault ?? null, triangle: hit?.triangle ?? null, values });
  }
  function valuesAt(triangle) {
    const found = {};
    for (const { key, title, low, step, unit } of data.fields) {
      const code = arrays[`field.${key}`][triangle];
      if (code !== NOTHING) found[title] = unit === "°" ? `${number(low + step * code, step < 1 ? 1 : 0).replace("-", "−")}°` : number(low + step * code, 2);
    }
    return found;
  }
  const KEYS = {
    ArrowLeft: () => view.turn(-7.5, 0), ArrowRight: () => view.turn(7.5, 0), ArrowUp: () => view.turn(0, 7.5), ArrowDown: () => view.turn(0, -7.5),
    "+": () => view.zoom(1.2), "=": () => view.zoom(1.2), "-": () => view.zoom(1 / 1.2), Escape: () => tell("pick", { fault: null, from: "scene" }),
  };
  place.addEventListener("keydown", (event) => {
    const act = event.target === canvas || event.key === "Escape" ? KEYS[event.key] : null;
    if (!act || event.ctrlKey || event.metaKey || event.altKey) return;
    event.preventDefault();
    act();
  });

  // --- the rest of the page ---

  document.addEventListener("structviz:pick", ({ detail }) => {
    const fault = Number.isInteger(detail?.fault) && detail.fault >= 0 && detail.fault < data.faults.length ? detail.fault : null;
    if (fault !== null && fault !== state.picked) view.visit(boxOf(fault));
    state.picked = fault;
    outline(fault);
  });
  document.addEventListener("structviz:show", ({ detail }) => {
    for (const fault of detail?.faults ?? []) state.shown[fault] = Boolean(detail.shown);
    colourAll();
    outline(state.picked);
  });
  matchMedia("(prefers-color-scheme: dark)").addEventListener("change", colourAll);
  canvas.addEventListener("webglcontextlost", (event) => {
    event.preventDefault();
    tell("scene-failed", { why: "the graphics were lost" });
  });

  // --- the first picture, then the tree for picking ---

  where.input.disabled = true;
  exaggerate(1);
  colourAll();
  fit();
  view.see(data.azimuth, 34, view.whole(1), view.place);
  cancelAnimationFrame(waiting);
  draw();
  performance.mark("structviz:first-picture");
  let size = [place.clientWidth, place.clientHeight].join();
  new ResizeObserver(() => {
    const now = [place.clientWidth, place.clientHeight].join();
    if (now === size) return;
    size = now;
    fit();
    draw();
  }).observe(place);
  setTimeout(() => {
    rimsOf = data.faults.map((_, k) => rimOf(mesh, begin[k], begin[k + 1]));
    drawRims();
    picker.build();
    performance.mark("structviz:pickable");
  }, 0);
}
