// The 3D view of the page: puts the parts together and speaks with the rest of the page through events.

import { readData } from "./data.js";
import { startView } from "./view.js";

const tell = (name, detail) => document.dispatchEvent(new CustomEvent(`structviz:${name}`, { detail }));
const place = document.getElementById("scene");

// The page has asked for WebGL and put the canvas in its place: three would write to the console where there is none.
if (document.documentElement.classList.contains("with-scene")) await start();
else place.classList.add("no-webgl");

async function start() {
  try {
    performance.mark("structviz:parsed");
    const { data, arrays } = await readData();
    performance.mark("structviz:inflated");
    startView(place, data, arrays, tell);
  } catch (error) {
    place.replaceChildren();
    place.classList.add("no-webgl");
    tell("scene-failed", { why: String(error?.message ?? error).slice(0, 200) });
  }
}
