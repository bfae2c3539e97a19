// The controls over the picture, as elements; text is always set as text.

export function element(tag, settings = {}, ...children) {
  const made = document.createElement(tag);
  for (const [key, value] of Object.entries(settings)) {
    if (key === "text") made.textContent = value;
    else if (key.startsWith("on")) made.addEventListener(key.slice(2), value);
    else if (value !== null && value !== undefined) made.setAttribute(key, value);
  }
  made.append(...children);
  return made;
}

export function choice(label, options, onchange) {
  const select = element("select", { onchange: () => onchange(select.value) });
  for (const [value, text] of options) select.append(element("option", { value, text }));
  return { row: element("label", { class: "sv-row" }, element("span", { text: label }), select), select };
}

export function slider(label, settings, oninput) {
  const output = element("output");
  const input = element("input", { type: "range", ...settings, oninput: () => oninput(Number(input.value)) });
  return { row: element("label", { class: "sv-row" }, element("span", { text: label }), input, output), input, output };
}

export function toggle(label, on, onchange, key) {
  const input = element("input", { type: "checkbox", "data-layer": key, onchange: () => onchange(input.checked) });
  input.checked = on;
  return element("label", { class: "sv-check" }, input, element("span", { text: label }));
}

export const number = (value, digits = 0) => value.toLocaleString("en", { minimumFractionDigits: digits, maximumFractionDigits: digits }).replaceAll(",", "\u2009").replace("-", "\u2212");

export const STYLE = `
#scene { overflow: hidden; }
#scene canvas { display: block; width: 100%; height: 100%; touch-action: none; outline-offset: -2px; }
.sv-panel { position: absolute; font-size: .8rem; line-height: 1.35; color: var(--ink, #22303c); background: color-mix(in srgb, var(--raised, #fff) 86%, transparent); border-radius: 3px; }
.sv-top { top: .55rem; left: .7rem; right: .7rem; display: flex; flex-wrap: wrap; gap: .3rem .5rem; align-items: center; background: none; pointer-events: none; }
.sv-top > * { pointer-events: auto; background: color-mix(in srgb, var(--raised, #fff) 86%, transparent); border-radius: 3px; }
.sv-row { display: flex; align-items: center; gap: .45rem; padding: .12rem .35rem; }
.sv-row > span:first-child { color: var(--quiet, #5b6872); }
.sv-panel select, .sv-panel button, .sv-panel summary { font: inherit; color: inherit; background: var(--raised, #fff); border: 1px solid var(--hair, #d9d7d0); border-radius: 3px; padding: .14rem .45rem; cursor: pointer; max-width: 13rem; }
.sv-panel option { background: var(--raised, #fff); color: var(--ink, #22303c); }
.sv-more { margin-left: auto; }
.sv-inside { background: color-mix(in srgb, var(--raised, #fff) 94%, transparent); } .sv-more summary { list-style: none; display: block; margin: 0; } .sv-more summary::first-letter { text-transform: uppercase; }
.sv-more summary::-webkit-details-marker { display: none; }
.sv-more[open] summary { border-color: var(--ink, #22303c); }
.sv-more { position: relative; } .sv-inside { position: absolute; right: 0; top: calc(100% + .25rem); z-index: 2; border: 1px solid var(--hair, #d9d7d0); border-radius: 3px; text-align: left; padding: .5rem .4rem .4rem; display: grid; grid-template-columns: minmax(0, 1fr); gap: .12rem; width: 18rem; max-width: calc(100vw - 3rem); }
.sv-inside .sv-row > span:first-child { width: 5.4rem; flex: none; }
.sv-inside input[type="range"] { flex: 1; min-width: 0; accent-color: var(--ink, #22303c); }
.sv-inside output { min-width: 5.4rem; text-align: right; white-space: nowrap; }
.sv-check { display: flex; gap: .45rem; align-items: center; padding: .08rem .35rem; }
.sv-check input { accent-color: var(--ink, #22303c); margin: 0; }
.sv-legend { left: .7rem; top: 2.9rem; padding: .25rem .4rem; pointer-events: none; max-width: calc(100% - 1.4rem); }
.sv-legend i { display: inline-block; width: .8em; height: .8em; margin-right: .4em; border-radius: 1px; vertical-align: -.05em; }
.sv-legend .sv-bar { width: 11rem; height: .6rem; margin: .2rem 0; border-radius: 1px; }
.sv-legend .sv-ends { display: flex; justify-content: space-between; width: 11rem; }
.sv-foot { left: .7rem; right: .7rem; bottom: .45rem; display: flex; align-items: flex-end; gap: .6rem; pointer-events: none; background: none; }
.sv-foot > * { background: color-mix(in srgb, var(--raised, #fff) 80%, transparent); border-radius: 3px; } .sv-scale { text-align: center; padding: 0 .3rem; }
.sv-scale div { height: 5px; border: 1px solid var(--ink, #22303c); border-top: 0; margin-bottom: .1rem; }
.sv-where { margin-left: auto; padding: 0 .3rem; text-align: right; color: var(--quiet, #5b6872); min-height: 1.35em; font-variant-numeric: tabular-nums; }
.sv-where:empty { display: none; }
.sv-where b { color: var(--ink, #22303c); font-weight: 600; }
.sv-note { color: var(--quiet, #5b6872); padding: .15rem .35rem; font-size: .75rem; }
.sv-names { position: absolute; inset: 0; overflow: hidden; pointer-events: none; font-size: .75rem; line-height: 1.25; }
.sv-names bdi { position: absolute; left: 0; top: 0; white-space: nowrap; padding: 0 .3rem; border-radius: 2px; color: var(--ink, #22303c); background: color-mix(in srgb, var(--raised, #fff) 82%, transparent); }
.sv-names .conflicting { border-bottom: 2px solid var(--conflicting, #a33a1c); }
.sv-names .picked { font-weight: 600; box-shadow: 0 0 0 1px var(--ink, #22303c); }
.sv-names .declared { border-bottom: 2px solid var(--ink, #22303c); }
.sv-names .predicted { border-bottom: 2px solid var(--sigma3, #d9a12b); }
.sv-names .stress { font-weight: 600; }
.sv-names .coordinate { background: color-mix(in srgb, var(--raised, #fff) 60%, transparent); color: var(--quiet, #5b6872); font-size: .68rem; font-variant-numeric: tabular-nums; padding: 0; }
.sv-glyph-note { color: var(--quiet, #5b6872); font-size: .75rem; margin-top: .15rem; }
.sv-heading { font-weight: 600; padding: .3rem .35rem .1rem; }
.sv-compass { width: 46px; height: 46px; flex: none; }
@media (max-width: 640px) { .sv-top .sv-row > span:first-child { display: none; } .sv-top { gap: .2rem; } .sv-top > .sv-row { padding: 0; } .sv-panel select { max-width: 8.5rem; } .sv-where { font-size: .72rem; } .sv-inside .sv-row > span:first-child { display: inline !important; } .sv-wide, .sv-glyph-note, .sv-names .coordinate { display: none; } }
`;
