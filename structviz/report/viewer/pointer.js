// What the mouse, the fingers and the keys do to the picture.

const STILL = 5; // pixels that a click may wander
const NEAR = [[0, 0], ...[2, 4].flatMap((far) => [[far, 0], [-far, 0], [0, far], [0, -far]])]; // pixels right and down of a click

// `acts` is { under(x, y), picked(hit), hovered(hit), stop() }, x and y from -1 to 1.
export function listen(canvas, acts) {
  const under = ({ clientX, clientY }, [right, down] = [0, 0]) => {
    const box = canvas.getBoundingClientRect();
    return acts.under(((clientX + right - box.left) / box.width) * 2 - 1, 1 - ((clientY + down - box.top) / box.height) * 2);
  };
  // A fault seen edge on is a pixel wide: a click beside it is meant for it.
  const near = (event) => NEAR.reduce((hit, aside) => hit ?? under(event, aside), null);
  let pressed = null;
  canvas.addEventListener("pointerdown", (event) => {
    acts.stop();
    pressed = [event.clientX, event.clientY];
  });
  canvas.addEventListener("click", (event) => {
    if (pressed && Math.hypot(event.clientX - pressed[0], event.clientY - pressed[1]) > STILL) return;
    acts.picked(near(event));
  });
  let hovering = 0;
  canvas.addEventListener("pointermove", (event) => {
    if (event.pointerType !== "mouse" || event.buttons || hovering) return;
    hovering = requestAnimationFrame(() => {
      hovering = 0;
      acts.hovered(under(event));
    });
  });
  canvas.addEventListener("pointerleave", () => acts.hovered(null));
}

// `keys` are functions by the name of a key; all but Escape act on the picture alone.
export function listenToKeys(place, canvas, keys) {
  place.addEventListener("keydown", (event) => {
    const act = event.target === canvas || event.key === "Escape" ? keys[event.key] : null;
    if (!act || event.ctrlKey || event.metaKey || event.altKey) return;
    event.preventDefault();
    act();
  });
}
