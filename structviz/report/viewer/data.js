// Reads what the page carries: a description, and arrays in one deflated stream.

const bytesOf = (text) => (Uint8Array.fromBase64 ? Uint8Array.fromBase64(text) : Uint8Array.from(atob(text), (c) => c.charCodeAt(0)));
const KINDS = { float32: Float32Array, int32: Int32Array, uint32: Uint32Array, uint16: Uint16Array, uint8: Uint8Array };

export async function readData() {
  const data = JSON.parse(document.getElementById("structviz-data").textContent);
  const packed = bytesOf(document.getElementById("structviz-arrays").textContent.trim());
  const stream = new Blob([packed]).stream().pipeThrough(new DecompressionStream("deflate"));
  const whole = await new Response(stream).arrayBuffer();
  const arrays = {};
  for (const [name, { type, shape, offset }] of Object.entries(data.arrays)) {
    arrays[name] = new KINDS[type](whole, offset, shape.reduce((a, b) => a * b, 1));
  }
  return { data, arrays };
}

// Turns differences of steps, axis by axis and modulo 65536, into places in a box.
export function placesOf({ low, step, vertices }, differences) {
  const at = new Float32Array(vertices * 3);
  for (let axis = 0; axis < 3; axis++) {
    let code = 0;
    for (let k = 0; k < vertices; k++) {
      code = (code + differences[axis * vertices + k]) & 0xffff;
      at[3 * k + axis] = low[axis] + step[axis] * code;
    }
  }
  return at;
}

// Turns places and corners, both as differences, of many surfaces into one list of triangles.
export function unpack(boxes, places, corners) {
  const total = boxes.reduce((sum, box) => sum + box.triangles, 0);
  const positions = new Float32Array(total * 9);
  const cornerOf = new Uint32Array(total * 3); // vertex within its own surface
  let place = 0;
  let corner = 0;
  for (const { low, step, vertices, triangles } of boxes) {
    const at = placesOf({ low, step, vertices }, places.subarray(place, place + 3 * vertices));
    place += 3 * vertices;
    let vertex = 0;
    for (let end = corner + 3 * triangles; corner < end; corner++) {
      vertex += corners[corner];
      cornerOf[corner] = vertex;
      positions[3 * corner] = at[3 * vertex];
      positions[3 * corner + 1] = at[3 * vertex + 1];
      positions[3 * corner + 2] = at[3 * vertex + 2];
    }
  }
  return { positions, cornerOf };
}

// First triangle of each surface, with the total at the end.
export const starts = (boxes) => boxes.reduce((all, box) => [...all, all.at(-1) + box.triangles], [0]);
