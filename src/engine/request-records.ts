/**
 * Requests in flight, a record of two cache lines each, in one buffer seen as doubles and as integers: with tens of thousands in
 * flight a request is cold each time it is touched, so what belongs to it lies together. A handle is the record's number.
 * Some words serve twice, first on the way down and then on the way up, as the names show.
 */
export interface Requests {
  readonly doubles: Float64Array;
  readonly ints: Int32Array;
}

export const RECORD_DOUBLES = 16;
export const RECORD_INTS = 32;

// large buffers start 16 bytes into a page; this puts records on cache lines
const SKIP = 6;

export function makeRequests(handles: number): Requests {
  const doubles = new Float64Array(handles * RECORD_DOUBLES + SKIP).subarray(SKIP);
  return { doubles, ints: new Int32Array(doubles.buffer, doubles.byteOffset, handles * RECORD_INTS) };
}

// integers
export const NEXT = 0; // in whichever queue the request stands, -1 at the end
export const PLACE = 1; // pseudo-channel
export const KERNEL = 2;
export const ENGINE = 3;
export const TAG = 4; // the work's own
export const USEFUL = 5; // bytes asked for
export const ATOMS = 6;
export const FLAGS = 7; // bit 0: op; bit 1: waited for a queue credit; bits 2-3: kind of answer; bits 8…: what held it back
export const ROW = 8;
export const BANK_COLUMN = 9; // bank << 16 | column

// doubles; ps unless named otherwise
export const READY = 5;
export const ISSUE = 6;
export const START = 7; // first byte on the down link
export const GATE_OR_UP_START = 8; // how long it was held back; later: first byte on the up link
export const CREDIT_OR_DONE = 9; // queue credit there; later: answer back at the die
export const NUMBER_OR_COMMAND = 10; // order of issue; later: first DRAM command, half clocks
export const ARRIVE = 11; // half clocks
export const FIRST_COLUMN = 12; // half clocks
export const DATA_END = 13; // half clocks
