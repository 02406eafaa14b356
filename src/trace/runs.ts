/**
 * The linear patterns: sequential, strided and block. The bytes of a die's share, numbered from 0, map to contiguous runs of
 * addresses (the whole region, one element, one row of a block); a run is cut where it crosses a multiple of the longest request,
 * so that no access is longer than a request and the bytes add up exactly.
 *
 * strided: one element a stride; when the region's end is reached the walk starts again one element further on, so that a walk
 * down the columns of a matrix in row order touches every byte once before any byte twice.
 * block: blocks of rows x width lie side by side across the pitch; when a line of blocks is full the next lies below it. A pitch
 * that is no whole number of widths leaves its end unused.
 */
import type { Pattern } from './batch.js';

export class RunWalk {
  private pattern: Pattern | null = null;
  private base = 0; // first address of the region
  private request = 1; // longest access, bytes
  private element = 1; // strided: bytes of one element
  private across = 1; // strided: elements of one pass; block: blocks side by side
  private turns = 1; // strided: passes before the region has been covered; block: lines of blocks in the region

  private left = 0; // bytes still to walk
  private address = 0; // next address
  private runLeft = 0; // bytes to the end of the run
  private step = 0; // bytes to the next request boundary
  private index = 0; // strided: element of the pass; block: block of the line
  private turn = 0; // strided: pass; block: line of blocks
  private row = 0; // block: row inside the block

  /** Points the walk at a region. */
  enter(pattern: Pattern, base: number, span: number, request: number): void {
    this.pattern = pattern;
    this.base = base;
    this.request = request;
    if (pattern.name === 'strided') {
      this.element = stridedElement(pattern, request);
      this.across = Math.max(1, Math.floor(span / pattern.stride));
      this.turns = Math.floor(pattern.stride / this.element);
    } else if (pattern.name === 'block') {
      this.across = Math.max(1, Math.floor(pattern.pitch / pattern.width));
      this.turns = Math.max(1, Math.floor(span / (pattern.pitch * pattern.rows)));
    }
  }

  /** Starts at byte `from` of the share and ends before byte `to`. */
  begin(from: number, to: number): void {
    const pattern = this.pattern as Pattern;
    this.left = to - from;
    if (pattern.name === 'sequential') {
      this.address = this.base + from;
    } else if (pattern.name === 'strided') {
      const number = Math.floor(from / this.element);
      const inside = from - number * this.element;
      this.turn = Math.floor(number / this.across);
      this.index = number - this.turn * this.across;
      this.turn %= this.turns;
      this.address = this.base + this.index * pattern.stride + this.turn * this.element + inside;
      this.runLeft = this.element - inside;
    } else {
      const blockBytes = pattern.rows * pattern.width;
      const number = Math.floor(from / blockBytes);
      const rest = from - number * blockBytes;
      this.row = Math.floor(rest / pattern.width);
      const inside = rest - this.row * pattern.width;
      this.turn = Math.floor(number / this.across);
      this.index = number - this.turn * this.across;
      this.turn %= this.turns;
      this.address = this.blockRow(pattern) + inside;
      this.runLeft = pattern.width - inside;
    }
    this.step = toBoundary(this.address, this.request);
  }

  fill(address: Float64Array, bytes: Int32Array, from: number, room: number): number {
    const { request } = this;
    const pattern = this.pattern as Pattern;
    if (pattern.name === 'sequential') return this.fillOneRun(address, bytes, from, room);
    const end = from + room;
    let { left, runLeft, step, address: at } = this;
    let i = from;
    for (; i < end && left > 0; i++) {
      if (runLeft === 0) {
        at = this.nextRun(pattern, at);
        runLeft = pattern.name === 'strided' ? this.element : pattern.width;
        step = toBoundary(at, request);
      }
      // biome-ignore lint/complexity/useMathMinMax: the choice costs 10 ns an access, Math.min 16 (Node 20)
      let length = step < runLeft ? step : runLeft;
      if (length > left) length = left;
      address[i] = at;
      bytes[i] = length;
      at += length;
      runLeft -= length;
      left -= length;
      step = request;
    }
    this.left = left;
    this.runLeft = runLeft;
    this.step = step;
    this.address = at;
    return i - from;
  }

  /** The same where the tile is one run: worth three times the speed. */
  private fillOneRun(address: Float64Array, bytes: Int32Array, from: number, room: number): number {
    const { request } = this;
    const end = from + room;
    let { left, step, address: at } = this;
    let i = from;
    for (; i < end && left > 0; i++) {
      const length = Math.min(step, left);
      address[i] = at;
      bytes[i] = length;
      at += length;
      left -= length;
      step = request;
    }
    this.left = left;
    this.step = step;
    this.address = at;
    return i - from;
  }

  /** Where the next run starts, `at` being the end of the last one. */
  private nextRun(pattern: Pattern, at: number): number {
    if (pattern.name === 'strided') {
      if (++this.index < this.across) return at + pattern.stride - this.element;
      this.index = 0;
      if (++this.turn === this.turns) this.turn = 0;
      return this.base + this.turn * this.element;
    }
    if (++this.row < pattern.rows) return at + pattern.pitch - pattern.width;
    this.row = 0;
    if (++this.index === this.across) {
      this.index = 0;
      if (++this.turn === this.turns) this.turn = 0;
    }
    return this.blockRow(pattern);
  }

  private blockRow(pattern: Pattern): number {
    const line = this.turn * pattern.rows + this.row;
    return this.base + line * pattern.pitch + this.index * pattern.width;
  }
}

/** Bytes of one strided element: the granule as given, else one request, never more than the stride. */
export function stridedElement(pattern: Pattern, requestBytes: number): number {
  return Math.min(pattern.granule > 0 ? pattern.granule : requestBytes, pattern.stride);
}

/** Bytes from an address to the next multiple of `request`, 1 … request. Exact for whole addresses up to 2^52. */
function toBoundary(address: number, request: number): number {
  const past = address - Math.floor(address / request) * request;
  // the quotient may round up to the next whole number, then `past` is negative
  return past < 0 ? -past : request - past;
}
