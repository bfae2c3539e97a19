// Colours of values: maps of our own, even in lightness and told apart by colour-blind eyes.

const STOPS = {
  plain: ["#1f2f52", "#2f5b7c", "#4c8790", "#86ad94", "#c9cd9a", "#f6e7b4"], // dark to light
  strong: ["#f1ead6", "#e6c58f", "#d3925b", "#b05a3e", "#7c2f36", "#431a2c"], // light to dark: more is worse
  round: ["#3b3f6b", "#3f7f93", "#d9d3b8", "#c07b4a", "#7d3a4f", "#3b3f6b"], // ends where it began
};
const MAPS = { dip_deg: "plain", predicted_rake_deg: "round", misfit_deg: "strong", slip_tendency: "strong", dilation_tendency: "plain" };
export const NOTHING = 65535;
const UNKNOWN = [176, 180, 184];

export const rgb = (hex) => [1, 3, 5].map((k) => parseInt(hex.slice(k, k + 2), 16));

export function stops(field) {
  return STOPS[MAPS[field.key] ?? (field.cyclic ? "round" : "plain")];
}

// One colour for every code of a field, three bytes each.
export function table(field) {
  const colours = stops(field).map(rgb);
  const count = Math.round((field.high - field.low) / field.step) + 1;
  const made = new Uint8Array(count * 3);
  for (let code = 0; code < count; code++) {
    const along = (code / Math.max(count - 1, 1)) * (colours.length - 1);
    const k = Math.min(Math.floor(along), colours.length - 2);
    for (let c = 0; c < 3; c++) made[3 * code + c] = Math.round(colours[k][c] + (along - k) * (colours[k + 1][c] - colours[k][c]));
  }
  return made;
}

// Writes the colours of all triangles; a hidden fault has no opacity and is not drawn.
export function paint(target, { begin, shownFaults, field, codes, verdictColours, picked }) {
  const lookup = field ? table(field) : null;
  for (let fault = 0; fault + 1 < begin.length; fault++) {
    const whole = verdictColours[fault];
    const alpha = shownFaults[fault] ? 255 : 0;
    for (let triangle = begin[fault]; triangle < begin[fault + 1]; triangle++) {
      let [r, g, b] = whole;
      if (lookup) {
        const code = codes[triangle];
        [r, g, b] = code === NOTHING ? UNKNOWN : lookup.subarray(3 * code, 3 * code + 3);
      }
      for (let at = 12 * triangle; at < 12 * triangle + 12; at += 4) {
        target[at] = r;
        target[at + 1] = g;
        target[at + 2] = b;
        target[at + 3] = alpha;
      }
    }
  }
}
