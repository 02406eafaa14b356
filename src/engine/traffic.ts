/** Bytes over the DRAM data buses: by kernel, and over time in at most 512 slices that double in length as the run goes on. */

const SLICES = 512;
const FIRST_SLICE_HALF = 512; // half clocks of a slice at the start

let movedRead = new Float64Array(64); // per kernel, atoms
let movedWrite = new Float64Array(64);
const sliceRead = new Float64Array(SLICES); // atoms
const sliceWrite = new Float64Array(SLICES);
let sliceHalf = FIRST_SLICE_HALF;

export function resetTraffic(): void {
  movedRead = new Float64Array(64);
  movedWrite = new Float64Array(64);
  sliceRead.fill(0);
  sliceWrite.fill(0);
  sliceHalf = FIRST_SLICE_HALF;
}

/** `atoms` of a kernel's reads (op 0) or writes crossed a data bus, the last of them about `half` half clocks. */
export function countMoved(kernel: number, op: number, atoms: number, half: number): void {
  if (kernel >= movedRead.length) grow(kernel);
  let slice = Math.floor(half / sliceHalf);
  while (slice >= SLICES) {
    merge();
    slice = Math.floor(half / sliceHalf);
  }
  if (op === 0) {
    movedRead[kernel] += atoms;
    sliceRead[slice] += atoms;
  } else {
    movedWrite[kernel] += atoms;
    sliceWrite[slice] += atoms;
  }
}

function grow(kernel: number): void {
  const size = 2 ** Math.ceil(Math.log2(kernel + 1));
  const wider = (old: Float64Array): Float64Array<ArrayBuffer> => {
    const out = new Float64Array(size);
    out.set(old);
    return out;
  };
  movedRead = wider(movedRead);
  movedWrite = wider(movedWrite);
}

/** Joins slices two by two, so that twice the time fits. */
function merge(): void {
  for (const slices of [sliceRead, sliceWrite]) {
    for (let i = 0; i < SLICES / 2; i++) slices[i] = slices[2 * i] + slices[2 * i + 1];
    slices.fill(0, SLICES / 2);
  }
  sliceHalf *= 2;
}

/** Atoms moved by a kernel so far. */
export function movedAtoms(kernel: number): { readonly read: number; readonly write: number } {
  return { read: movedRead[kernel] ?? 0, write: movedWrite[kernel] ?? 0 };
}

/** The slices up to the last that saw traffic; lengths in half clocks, contents in atoms. */
export function timeline(): { readonly sliceHalf: number; readonly read: Float64Array; readonly write: Float64Array } {
  let used = SLICES;
  while (used > 0 && sliceRead[used - 1] === 0 && sliceWrite[used - 1] === 0) used--;
  return { sliceHalf, read: sliceRead.slice(0, used), write: sliceWrite.slice(0, used) };
}
