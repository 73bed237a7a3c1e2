// The browser's half of byway.widgets.wire: a dict with a version, and arrays as little-endian binary buffers.

const VERSION = 1;
const TYPES = {
  uint8: Uint8Array, int16: Int16Array, uint16: Uint16Array, int32: Int32Array, uint32: Uint32Array,
  float32: Float32Array,
};

async function inflated(buffer) {
  const bytes = new Blob([buffer]).stream().pipeThrough(new DecompressionStream("deflate"));
  return new Response(bytes).arrayBuffer();
}

function raw(buffer) {
  if (buffer instanceof ArrayBuffer) return buffer;
  return buffer.buffer.slice(buffer.byteOffset, buffer.byteOffset + buffer.byteLength); // typed arrays want alignment
}

/** The arrays of a message by name: each `{data, shape}`. A promise only where something must be inflated. */
export function receive(message, buffers) {
  if (message.wire !== VERSION) throw new Error(`wire version ${message.wire}, expected ${VERSION}`);
  const arrays = {};
  const waits = [];
  (message.arrays || []).forEach((head, n) => {
    const place = (buffer) => {
      arrays[head.name] = { data: new TYPES[head.type](buffer), shape: head.shape };
    };
    if (head.packed) waits.push(inflated(buffers[n]).then(place));
    else place(raw(buffers[n]));
  });
  return waits.length ? Promise.all(waits).then(() => arrays) : arrays;
}

/** A message to the kernel; `arrays` maps names to typed arrays. Returns what `model.send` takes. */
export function packed(kind, fields, arrays) {
  const heads = [];
  const buffers = [];
  for (const [name, data] of Object.entries(arrays || {})) {
    const type = Object.keys(TYPES).find((key) => data instanceof TYPES[key]);
    heads.push({ name, type, shape: [data.length], packed: "" });
    buffers.push(data.buffer.slice(data.byteOffset, data.byteOffset + data.byteLength));
  }
  return [{ wire: VERSION, kind, arrays: heads, ...fields }, buffers];
}

/** Hands messages on one after the other, in the order of arrival, also where some must be inflated first. */
export function inOrder(handle) {
  let last = null;
  return (message, buffers) => {
    const arrays = receive(message, buffers || []);
    if (last === null && !(arrays instanceof Promise)) {
      handle(message, arrays);
      return;
    }
    const mine = Promise.all([last, arrays]).then(([, got]) => handle(message, got)).catch((e) => console.error(e));
    last = mine;
    mine.then(() => {
      if (last === mine) last = null;
    });
  };
}
