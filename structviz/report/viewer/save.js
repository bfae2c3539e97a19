// The picture as a file: the view with its title, names, legend, north arrow, scale, where it lies, and the caution.

const MARGIN = 14;
const HEAD = 52;
const TAIL = 30;
const SANS = '"Noto Sans", "Liberation Sans", "DejaVu Sans", sans-serif';

// `view` is { canvas, width, height, names, legend, foot, looking }; width and height in page pixels. Returns a canvas.
export function composed(view, data, theme) {
  const scale = view.canvas.width / view.width;
  const whole = document.createElement("canvas");
  whole.width = view.canvas.width;
  whole.height = Math.round(view.canvas.height + (HEAD + TAIL) * scale);
  const pen = whole.getContext("2d");
  pen.scale(scale, scale);
  pen.fillStyle = theme.colour("raised");
  pen.fillRect(0, 0, view.width, view.height + HEAD + TAIL);
  pen.drawImage(view.canvas, 0, HEAD, view.width, view.height);
  head(pen, data, theme, view.width);
  pen.save();
  pen.translate(0, HEAD);
  for (const name of view.names) label(pen, name, theme);
  legend(pen, view.legend, theme);
  foot(pen, view.foot, theme, view.height);
  pen.restore();
  tail(pen, data, theme, view);
  return whole;
}

function words(pen, text, x, y, size, colour, weight = 400, align = "left") {
  pen.font = `${weight} ${size}px ${SANS}`;
  pen.fillStyle = colour;
  pen.textAlign = align;
  pen.textBaseline = "alphabetic";
  pen.fillText(text, x, y);
}

// Text cut to a width, with a mark that it was.
function fitted(pen, text, wide, font) {
  pen.font = font;
  if (pen.measureText(text).width <= wide) return text;
  let cut = text;
  while (cut.length > 1 && pen.measureText(`${cut}…`).width > wide) cut = [...cut].slice(0, -1).join("");
  return `${cut}…`;
}

function head(pen, data, theme, width) {
  const room = width - 2 * MARGIN;
  const size = [17, 15, 13].find((each) => fitted(pen, data.headline, room, `600 ${each}px ${SANS}`) === data.headline) ?? 12;
  words(pen, fitted(pen, data.headline, room, `600 ${size}px ${SANS}`), MARGIN, 25, size, theme.colour("ink"), 600);
  words(pen, fitted(pen, data.title, room, `400 12px ${SANS}`), MARGIN, 43, 12, theme.colour("quiet"));
}

function label(pen, { text, kind, x, y, wide, tall }, theme) {
  const left = x - wide / 2;
  if (kind !== "coordinate") {
    pen.globalAlpha = 0.82;
    pen.fillStyle = theme.colour("raised");
    pen.fillRect(left, y, wide, tall);
    pen.globalAlpha = 1;
  }
  const quiet = kind === "coordinate";
  words(pen, text, x, y + tall - (quiet ? 3 : 5), quiet ? 10 : 12, theme.colour(quiet ? "quiet" : "ink"), 400, "center");
  const line = { conflicting: "conflicting", "slip declared": "ink", "slip predicted": "sigma3" }[kind];
  if (!line) return;
  pen.fillStyle = theme.colour(line);
  pen.fillRect(left, y + tall - 2, wide, 2);
}

function legend(pen, { words: verdicts, title, ends, stops, note }, theme) {
  const ink = theme.colour("ink");
  let y = MARGIN;
  for (const word of verdicts ?? []) {
    pen.fillStyle = theme.colour(word);
    pen.fillRect(MARGIN, y, 10, 10);
    words(pen, word, MARGIN + 16, y + 9.5, 12, ink);
    y += 17;
  }
  if (title) {
    words(pen, title, MARGIN, y + 10, 12, ink);
    const shade = pen.createLinearGradient(MARGIN, 0, MARGIN + 180, 0);
    stops.forEach((colour, k) => shade.addColorStop(k / (stops.length - 1), colour));
    pen.fillStyle = shade;
    pen.fillRect(MARGIN, y + 16, 180, 9);
    ends.forEach((text, k) => words(pen, text, MARGIN + 90 * k, y + 38, 11, ink, 400, ["left", "center", "right"][k]));
    y += 46;
  }
  if (note) words(pen, note, MARGIN, y + 10, 11, theme.colour("quiet"));
}

function foot(pen, { path, north, bar, length }, theme, height) {
  const ink = theme.colour("ink");
  pen.save();
  pen.translate(MARGIN + 23, height - 30);
  pen.strokeStyle = pen.fillStyle = ink;
  pen.globalAlpha = 0.25;
  pen.beginPath();
  pen.arc(0, 0, 21, 0, 7);
  pen.stroke();
  pen.globalAlpha = 1;
  pen.fill(new Path2D(path));
  words(pen, "N", north[0], north[1] + 4, 11, ink, 600, "center");
  pen.restore();
  const left = MARGIN + 62;
  pen.strokeStyle = ink;
  pen.beginPath();
  pen.moveTo(left, height - 31);
  pen.lineTo(left, height - 25);
  pen.lineTo(left + bar, height - 25);
  pen.lineTo(left + bar, height - 31);
  pen.stroke();
  words(pen, length, left + bar / 2, height - 11, 12, ink, 400, "center");
}

function tail(pen, data, theme, { width, height, looking }) {
  const top = height + HEAD;
  pen.fillStyle = theme.colour("hair");
  pen.fillRect(MARGIN, top + 2, width - 2 * MARGIN, 1);
  const said = [looking, data.caution].filter(Boolean).join("  ");
  words(pen, fitted(pen, said, width - 2 * MARGIN, `400 10.5px ${SANS}`), MARGIN, top + 19, 10.5, theme.colour("quiet"));
}
