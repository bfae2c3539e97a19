// One view: what is shown, how it is coloured, and how it answers to its controls and to the rest of the page.

import { AmbientLight, Box3, ColorManagement, DirectionalLight, Group, LinearSRGBColorSpace, Scene, Vector3, WebGLRenderer } from "three";
import { makeCamera } from "./camera.js";
import { paint, rgb } from "./colours.js";
import { fillLegend, fillWhere, legendOf, makeFoot, worded } from "./furniture.js";
import { inPieces } from "./idle.js";
import { grouped, makeLayers } from "./layers.js";
import { makeNames } from "./names.js";
import { choice, element, number, slider, STYLE, toggle } from "./panel.js";
import { makePicked } from "./picked.js";
import { makePicker } from "./picking.js";
import { listen, listenToKeys } from "./pointer.js";
import { makeRims } from "./rims.js";
import { composed } from "./save.js";
import { faultMesh } from "./scene.js";
import { AXES, makeSection } from "./section.js";
import { makeTheme } from "./theme.js";

const SHARP = 2; // pixels of a saved picture to one of the page, at least
const POINTS = [["oblique", "Oblique"], ["map", "Map"], ["south", "From the south"], ["west", "From the west"], ["strike", "Along strike"]];

export function startView(place, data, arrays, tell) {
  ColorManagement.enabled = false;
  const theme = makeTheme();
  const canvas = place.querySelector("canvas");
  const renderer = new WebGLRenderer({ canvas, context: canvas.getContext("webgl2"), alpha: true });
  const pixels = Math.min(devicePixelRatio, 2);
  renderer.setPixelRatio(pixels);
  renderer.localClippingEnabled = true;
  renderer.outputColorSpace = LinearSRGBColorSpace; // with the line below: colours reach the screen as they stand in the legend
  canvas.tabIndex = 0;
  canvas.setAttribute("role", "application");
  canvas.setAttribute("aria-label", "The model in 3D: arrows turn it, plus and minus zoom, Escape lets go of a fault");
  place.replaceChildren(element("style", { text: STYLE }), canvas);

  const state = { picked: null, height: 1, field: null, shown: data.faults.map(() => true) };
  const mesh = faultMesh(data, arrays);
  performance.mark("structviz:unpacked");
  const { begin } = mesh.userData;
  const view = makeCamera(canvas, data, () => redraw());
  const layers = makeLayers(data, arrays, theme, view.size);
  const { stretched, upright } = grouped(layers);
  const rims = makeRims(data, mesh, theme, () => redraw());
  const chosen = makePicked(data, mesh, theme);
  const section = makeSection(data);
  const picker = makePicker(data, mesh, view.camera);
  const foot = makeFoot();
  const names = makeNames(data, place);
  const legend = element("div", { class: "sv-panel sv-legend" });
  const model = new Group().add(mesh, stretched, rims.group, chosen.group);
  const lamp = new DirectionalLight("#ffffff", 0.42 * Math.PI);
  const scene = new Scene().add(model, upright, new AmbientLight("#ffffff", 0.62 * Math.PI), lamp, lamp.target);
  const visible = (key) => layers.some((layer) => layer.key === key && layer.object.visible);

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
    foot.update(view.camera, place.clientWidth);
    names.update(view.camera, state, section, visible, chosen.state.tips);
  }
  function fit() {
    const [width, height] = [place.clientWidth, place.clientHeight];
    if (!width || !height) return;
    renderer.setSize(width, height, false);
    view.resize(width, height);
  }

  // --- what is shown ---

  const glyphsShown = () => layers.some(({ glyphs, object }) => glyphs && object.visible);
  function colourAll() {
    const verdictColours = data.faults.map(({ verdict }) => rgb(theme.colour(verdict)));
    const codes = state.field ? arrays[`field.${state.field.key}`] : null;
    const held = mesh.geometry.getAttribute("color");
    paint(held.array, { begin, shownFaults: state.shown, field: state.field, codes, verdictColours });
    held.needsUpdate = true;
    explain();
  }
  function explain() {
    fillLegend(legend, legendOf(data, state.field, glyphsShown()), data);
    redraw();
  }
  const boxOf = (fault) => {
    const { low, step } = data.faults[fault];
    const box = new Box3(new Vector3(...low), new Vector3(...low.map((value, k) => value + data.steps * step[k])));
    box.min.z *= state.height;
    box.max.z *= state.height;
    return box;
  };
  function outline() {
    const fault = state.picked !== null && state.shown[state.picked] ? state.picked : null;
    chosen.show(fault);
    rims.outline(fault);
  }
  const cutMaterials = [mesh.material, ...rims.materials, ...chosen.materials, ...layers.filter(({ glyphs, key }) => !glyphs && key !== "frame").map(({ object }) => object.material)];
  function cut(text, share) {
    section.set(text, share);
    const planes = section.planes(state.height);
    for (const material of cutMaterials) material.clippingPlanes = planes;
    const at = section.at();
    where.output.textContent = at === null ? "" : `${number(data.origin[section.axis()] + at)} m`;
    where.input.disabled = at === null;
    redraw();
  }
  function exaggerate(height) {
    state.height = height;
    model.scale.z = height;
    model.updateMatrixWorld(true);
    for (const { object, glyphs } of layers) if (glyphs) object.userData.raise(height);
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
  const switches = (of) => layers.filter(of).map((layer) => toggle(layer.label, layer.on, (value) => {
    layer.object.visible = value;
    explain();
  }, layer.key));
  const group = (title, rows) => (rows.length ? [element("div", { class: "sv-group", role: "group", "aria-label": title }, element("div", { class: "sv-heading", text: title }), ...rows)] : []);
  const simplified = data.tolerance > 0 ? `Drawn with ${number(data.triangles[1])} of ${number(data.triangles[0])} triangles; no point is moved by more than ${number(data.tolerance, 1)} m. The numbers rest on all of them.` : "";
  const inside = element("div", { class: "sv-inside" }, across.row, where.row, tall.row,
    element("div", { class: "sv-note", text: "Exaggeration stretches heights alone: angles are then not true." }),
    ...group("Stress glyphs", switches(({ glyphs }) => glyphs)), ...group("Also shown", switches(({ glyphs }) => !glyphs)),
    ...(simplified ? [element("div", { class: "sv-note", text: simplified })] : []));
  const more = element("details", { class: "sv-more" }, element("summary", {}, element("span", { class: "sv-wide", text: "Section, " }), "layers"), inside);
  const save = element("button", { type: "button", onclick: savePicture, "aria-label": "Save picture" }, "Save", element("span", { class: "sv-wide", text: " picture" }));
  place.append(element("div", { class: "sv-panel sv-top" }, colouring.row, looking.row, save, more), legend, foot.box);

  function look(name) {
    const strike = state.picked === null ? data.azimuth : data.faults[state.picked].strike;
    const places = { oblique: [data.azimuth, 34], map: [180, 90], south: [180, 4], west: [270, 4], strike: [strike + 180, 6] };
    const box = name === "strike" && state.picked !== null ? boxOf(state.picked).expandByScalar(0.06 * view.size) : view.whole(state.height);
    view.see(...places[name], box);
  }
  function savePicture() {
    renderer.setPixelRatio(Math.max(pixels, SHARP));
    fit();
    draw();
    const raised = state.height > 1 ? `Heights × ${number(state.height, 1)}.` : "";
    const drawn = { canvas, width: place.clientWidth, height: place.clientHeight, names: names.kept, legend: legendOf(data, state.field, glyphsShown()), foot: foot.shown, looking: raised };
    const whole = composed(drawn, data, theme);
    renderer.setPixelRatio(pixels);
    fit();
    draw();
    whole.toBlob((blob) => {
      const link = element("a", { href: URL.createObjectURL(blob), download: "structviz-3d.png" });
      link.click();
      setTimeout(() => URL.revokeObjectURL(link.href), 5000);
    }, "image/png");
  }

  // --- the mouse, fingers and keys ---

  let last = null;
  const letGo = () => tell("pick", { fault: null, from: "scene" });
  listen(canvas, {
    stop: view.stop,
    under: (x, y) => picker.at(x, y, state.shown, (point) => section.keeps(point, state.height)),
    picked: (hit) => tell("pick", { fault: hit?.fault ?? null, from: "scene" }),
    hovered(hit) {
      if (!hit && !last) return;
      last = hit;
      const values = hit ? valuesAt(hit.triangle) : null;
      const shown = hit && state.field ? `${state.field.title} ${values[state.field.title] ?? "not known"}` : "";
      fillWhere(foot.where, data.origin, hit ? data.faults[hit.fault].short : "", hit?.point, state.height, shown);
      canvas.style.cursor = hit ? "pointer" : "";
      tell("hover", { fault: hit?.fault ?? null, triangle: hit?.triangle ?? null, values });
    },
  });
  const valuesAt = (triangle) => Object.fromEntries(data.fields.map((field) => [field.title, worded(field, arrays[`field.${field.key}`][triangle])]).filter(([, value]) => value));
  listenToKeys(place, canvas, {
    ArrowLeft: () => view.turn(-7.5, 0), ArrowRight: () => view.turn(7.5, 0), ArrowUp: () => view.turn(0, 7.5), ArrowDown: () => view.turn(0, -7.5),
    "+": () => view.zoom(1.2), "=": () => view.zoom(1.2), "-": () => view.zoom(1 / 1.2), Escape: letGo,
  });

  // --- the rest of the page ---

  document.addEventListener("structviz:pick", ({ detail }) => {
    const fault = Number.isInteger(detail?.fault) && detail.fault >= 0 && detail.fault < data.faults.length ? detail.fault : null;
    if (fault !== null && fault !== state.picked) view.visit(boxOf(fault));
    state.picked = fault;
    outline();
  });
  document.addEventListener("structviz:show", ({ detail }) => {
    for (const fault of detail?.faults ?? []) state.shown[fault] = Boolean(detail.shown);
    colourAll();
    rims.draw(state.shown);
    outline();
  });
  theme.listen(colourAll);
  canvas.addEventListener("webglcontextlost", (event) => {
    event.preventDefault();
    tell("scene-failed", { why: "the graphics were lost" });
  });

  // --- the first picture; rims and the trees for picking when there is time ---

  where.input.disabled = true;
  exaggerate(1);
  colourAll();
  fit();
  view.see(data.azimuth, 34, view.whole(1), view.place);
  cancelAnimationFrame(waiting);
  draw();
  performance.mark("structviz:first-picture");
  performance.mark("structviz:pickable"); // a tree that is not made yet is made when its fault is pointed at
  let size = [place.clientWidth, place.clientHeight].join();
  new ResizeObserver(() => {
    const now = [place.clientWidth, place.clientHeight].join();
    if (now === size) return;
    size = now;
    names.measure();
    fit();
    draw();
  }).observe(place);
  inPieces(rims.count, rims.work, () => {
    rims.finish(state.shown);
    inPieces(picker.count, picker.work, () => performance.mark("structviz:settled"));
  });
}
