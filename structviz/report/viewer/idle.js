// Work in small pieces between pictures, so that the page answers while it is done.

const SLICE_MS = 12;
const later = globalThis.requestIdleCallback ?? ((work) => setTimeout(() => work({ timeRemaining: () => SLICE_MS }), 16));

// Calls work(0), work(1) ... up to `count`, a few at a time, then `done`.
export function inPieces(count, work, done = () => {}) {
  let next = 0;
  const piece = (deadline) => {
    const end = performance.now() + Math.max(SLICE_MS, deadline.timeRemaining());
    while (next < count && performance.now() < end) work(next++);
    if (next < count) later(piece, { timeout: 500 });
    else done();
  };
  later(piece, { timeout: 500 });
}
