// The list, the search, the record and what links them to the 3D view and the plots.
// Every part listens for "structviz:pick" and marks its own; none knows of another.

const $ = (selector, within = document) => within.querySelector(selector);
const $$ = (selector, within = document) => [...within.querySelectorAll(selector)];
const list = $("#fault-list");
const record = $("#record");
const start = record.firstElementChild;
const buttons = $$("button.fault", list);
const narrow = matchMedia("(max-width: 999px)");
const calm = matchMedia("(prefers-reduced-motion: reduce)");
let picked = null;

const tell = (name, detail) => document.dispatchEvent(new CustomEvent(`structviz:${name}`, { detail }));
const pick = (fault, from) => tell("pick", { fault, from });
const shown = () => buttons.filter((button) => !button.closest("[hidden]"));

// --- the record -----------------------------------------------------------------------------

function fill(fault) {
  const card = fault === null ? null : document.getElementById(`fault-${fault}`);
  const copy = card ? card.cloneNode(true) : start;
  copy.removeAttribute("id");
  copy.removeAttribute("data-fault");
  record.replaceChildren(copy);
  record.scrollTop = 0;
  $("#local").textContent = "";
}

function mark(fault) {
  for (const element of $$(".picked")) element.classList.remove("picked");
  for (const button of buttons) button.removeAttribute("aria-current");
  if (fault === null) return;
  for (const element of $$(`[data-fault="${fault}"]`)) element.classList.add("picked");
  const row = buttons.find((button) => Number(button.dataset.fault) === fault);
  if (!row) return;
  row.setAttribute("aria-current", "true");
  stop(row);
  if (!row.closest("[hidden]")) keepInView(row);
}

// Scrolls the list alone: scrollIntoView would move the page as well.
function keepInView(row) {
  const box = list.getBoundingClientRect();
  const place = row.getBoundingClientRect();
  if (place.top < box.top + 34) list.scrollTop += place.top - box.top - 34;
  else if (place.bottom > box.bottom) list.scrollTop += place.bottom - box.bottom;
}

document.addEventListener("structviz:pick", ({ detail }) => {
  const fault = Number.isInteger(detail?.fault) ? detail.fault : null;
  if (fault !== picked) fill(fault);
  picked = fault;
  mark(fault);
  if (fault !== null && detail.from !== "scene" && narrow.matches) record.parentElement.scrollIntoView({ behavior: calm.matches ? "auto" : "smooth" });
});

document.addEventListener("structviz:hover", ({ detail }) => {
  const fault = detail?.fault ?? null;
  for (const element of $$(".hovered")) element.classList.remove("hovered");
  if (fault !== null) for (const element of $$(`[data-fault="${fault}"]`)) element.classList.add("hovered");
  $("#local").textContent = fault === null || !detail.values ? "" : `Under the cursor: ${worded(detail.values)}`;
});

const short = (value) => (typeof value === "number" ? Math.round(value * 100) / 100 : value);
const worded = (values) => {
  if (typeof values === "string") return values;
  if (Array.isArray(values)) return values.map(short).join(", ");
  return Object.entries(values).map(([key, value]) => `${key} ${short(value)}`).join(", ");
};

// --- the list -------------------------------------------------------------------------------

function stop(row) {
  for (const button of buttons) button.tabIndex = button.nextElementSibling.tabIndex = button === row ? 0 : -1;
}

list.addEventListener("click", (event) => {
  const row = event.target.closest("button.fault");
  if (row) return pick(Number(row.dataset.fault) === picked ? null : Number(row.dataset.fault), "list");
  const eye = event.target.closest("button.eye");
  if (eye) return show([eye.parentElement], eye.parentElement.classList.contains("off"));
  const hide = event.target.closest("button.hide");
  if (hide) show($$("li", hide.closest(".group")), hide.getAttribute("aria-pressed") === "true");
});

// Shows or hides the faults of some rows in the 3D view.
function show(rows, visible) {
  for (const row of rows) {
    row.classList.toggle("off", !visible);
    $(".eye", row).setAttribute("aria-pressed", String(!visible));
  }
  const group = rows[0].closest(".group");
  const none = !$("li:not(.off)", group);
  $(".hide", group).setAttribute("aria-pressed", String(none));
  $(".hide", group).textContent = none ? "show" : "hide";
  tell("show", { faults: rows.map((row) => Number($("button.fault", row).dataset.fault)), shown: visible });
}

for (const button of buttons) {
  const eye = document.createElement("button");
  eye.type = "button";
  eye.className = "eye";
  eye.tabIndex = -1;
  eye.setAttribute("aria-pressed", "false");
  eye.setAttribute("aria-label", `Hide ${$(".name", button).textContent} in 3D`);
  button.after(eye);
}

const MOVES = { ArrowDown: 1, ArrowUp: -1, PageDown: 8, PageUp: -8, Home: -Infinity, End: Infinity };

list.addEventListener("keydown", (event) => {
  const row = event.target.closest("button.fault");
  if (!row) return;
  if (event.key === "Escape") return pick(null, "list");
  if (!(event.key in MOVES)) return;
  event.preventDefault();
  const rows = shown();
  const next = rows[Math.min(rows.length - 1, Math.max(0, rows.indexOf(row) + MOVES[event.key]))];
  stop(next);
  next.focus({ preventScroll: true });
  keepInView(next);
});

const plain = (text) => text.toLocaleLowerCase().normalize("NFKD");
const texts = buttons.map((button) => plain(`${button.textContent} ${button.closest(".group").dataset.word}`));

$("#search").addEventListener("input", (event) => {
  const words = plain(event.target.value).split(/\s+/).filter(Boolean);
  buttons.forEach((button, k) => (button.parentElement.hidden = !words.every((word) => texts[k].includes(word))));
  for (const group of $$(".group", list)) group.hidden = !$("li:not([hidden])", group);
  $("#none-found").hidden = shown().length > 0;
  const rows = shown();
  if (rows.length) stop(rows.find((row) => row.hasAttribute("aria-current")) ?? rows[0]);
});

$("#search").addEventListener("keydown", (event) => {
  if (event.key !== "ArrowDown" || !shown().length) return;
  event.preventDefault();
  shown()[0].focus();
});

// --- the plots and the argument -----------------------------------------------------------------

document.addEventListener("click", async (event) => {
  const copy = event.target.closest("button.copy");
  if (copy) return copied(copy);
  const inPlot = event.target.closest(".plot [data-fault], #every-fault [data-fault]");
  if (inPlot) pick(Number(inPlot.dataset.fault), "plot");
});

document.addEventListener("pointerover", (event) => {
  const fault = event.target.closest?.(".plot [data-fault], button.fault[data-fault]");
  if (fault) tell("hover", { fault: Number(fault.dataset.fault), triangle: null, values: null });
});
document.addEventListener("pointerout", (event) => {
  if (event.target.closest?.(".plot [data-fault], button.fault[data-fault]")) tell("hover", { fault: null, triangle: null, values: null });
});

// A thin line is hard to meet: each has a wide, clear one over it.
for (const line of $$(".plot path.line")) {
  const wide = line.cloneNode();
  wide.setAttribute("class", "wide");
  line.after(wide);
}

async function copied(button) {
  const text = button.parentElement.querySelector(".as-text").textContent;
  try {
    await navigator.clipboard.writeText(text);
  } catch {
    byHand(text);
  }
  button.textContent = "Copied";
  setTimeout(() => (button.textContent = "Copy as text"), 1600);
}

// Where the browser keeps the clipboard from pages opened from disk.
function byHand(text) {
  const area = document.createElement("textarea");
  area.value = text;
  area.className = "off-screen";
  document.body.append(area);
  area.select();
  document.execCommand("copy");
  area.remove();
}

addEventListener("beforeprint", () => $$("details").forEach((each) => (each.open = true)));

// --- light and dark --------------------------------------------------------------------------------

const night = matchMedia("(prefers-color-scheme: dark)");
const dark = [...document.styleSheets].flatMap((sheet) => [...sheet.cssRules]).find((rule) => rule.media?.mediaText.includes("prefers-color-scheme"));

// The button names what it leads to. What is chosen holds for this visit: a page from disk keeps nothing.
function offerThemes() {
  const button = document.createElement("button");
  button.type = "button";
  button.className = "theme";
  let now = night.matches;
  const name = () => (button.textContent = now ? "Light" : "Dark");
  button.addEventListener("click", () => {
    now = !now;
    dark.media.mediaText = now ? "screen" : "not all";
    document.documentElement.style.colorScheme = now ? "dark" : "light";
    name();
    tell("theme", { dark: now });
  });
  night.addEventListener("change", () => {
    if (dark.media.mediaText.includes("prefers")) now = night.matches;
    name();
  });
  name();
  $(".contents")?.append(button);
}
if (dark) offerThemes();

// --- where the 3D view is missing ---------------------------------------------------------------

function without(why) {
  document.documentElement.classList.remove("with-scene");
  $("#why-no-scene").textContent = why;
}

// The canvas that is asked is the one the view draws on: a second context would take as long again.
function hasWebGL() {
  const canvas = document.createElement("canvas");
  try {
    if (!canvas.getContext("webgl2", { alpha: true, antialias: true, preserveDrawingBuffer: true })) return false;
  } catch {
    return false;
  }
  $("#scene").replaceChildren(canvas);
  return true;
}

const INSTEAD = $(".instead img") ? "The prepared picture stands in its place; everything else is complete." : "Everything else is complete.";
document.documentElement.classList.add("scripted");
if (!$('script[data-part="viewer"]')) without(`This page was made without the 3D view. ${INSTEAD}`);
else if (!hasWebGL()) without(`The 3D view needs WebGL, which this browser does not offer. ${INSTEAD}`);
else document.documentElement.classList.add("with-scene");
document.addEventListener("structviz:scene-failed", ({ detail }) => without(`The 3D view could not be started${detail?.why ? ` (${detail.why})` : ""}. ${INSTEAD}`));

if (buttons.length) stop(buttons[0]);
