/**
 * Gives every kernel its place: which die does how much of it, and where in each die's own memory it reads and writes.
 *
 * Sharing: a kernel with no die of its own is cut evenly over all dies, so that the bytes of the dies add up to the kernel's
 * exactly. Each die cuts its part into tiles of about `tileBytes` of the side that is loaded (of the stored side when nothing is
 * loaded; one tile an engine when the kernel moves nothing).
 *
 * Regions: each die hands out its range in the order of the trace, the read region of a kernel and then its write region, from
 * 4 KiB boundaries. Between two regions some pages are left free, a different number each time, so that regions whose sizes are
 * powers of two do not all begin in the same bank. When the next kernel does not fit before the end of the range, handing out
 * starts again at the beginning: later kernels then use the memory of earlier ones, as buffers of a real program do. What one
 * kernel wrote is not what the next one reads; a package has no cache in front of memory that could tell the difference.
 */
import { InputError } from '../errors.js';
import { formatBytes } from '../units.js';
import type { DieGeometry, Kernel, KernelShare, KernelTrace, Pattern, PlacedKernel } from './batch.js';
import { stridedElement } from './runs.js';
import { cut } from './share.js';

const PAGE = 4096; // bytes regions are aligned to: common practice, no source
const GAP_PAGES = 64; // the free pages between regions run through 1 … 64
const GAP_STEP = 37; // in this order: a step that is odd meets each number once in 64 regions

/**
 * Places all kernels of a trace. Throws InputError when a kernel names a die the package has not, or when one kernel alone is
 * larger than the memory of its die.
 */
export function placeKernels(trace: KernelTrace, geometry: readonly DieGeometry[]): PlacedKernel[] {
  const memories = geometry.map((die) => new RangeCursor(die));
  return trace.kernels.map((kernel) => {
    if (kernel.die >= geometry.length) {
      throw new InputError({
        where: { file: trace.file, line: kernel.line, path: 'die' },
        found: `die ${kernel.die}`,
        expected: `a die of the package, 0 to ${geometry.length - 1}`,
        hint: 'leave the cell empty to share the kernel out over all dies',
      });
    }
    const shares = geometry.map((die, index) => {
      if (kernel.die >= 0 && kernel.die !== index) return NO_SHARE;
      const part = kernel.die >= 0 ? 0 : index;
      const parts = kernel.die >= 0 ? 1 : geometry.length;
      return placeShare(trace.file, kernel, die, memories[index], part, parts);
    });
    return { kernel, shares };
  });
}

const NO_SHARE: KernelShare = {
  readBase: 0,
  readSpan: 0,
  writeBase: 0,
  writeSpan: 0,
  tiles: 0,
  readBytes: 0,
  writeBytes: 0,
  flops: 0,
};

/** Part `part` of `parts` of a kernel, on one die. */
function placeShare(
  file: string,
  kernel: Kernel,
  die: DieGeometry,
  memory: RangeCursor,
  part: number,
  parts: number,
): KernelShare {
  const portion = (total: number) => cut(total, part + 1, parts) - cut(total, part, parts);
  const readBytes = portion(kernel.readBytes);
  const writeBytes = portion(kernel.writeBytes);
  // the last die takes what is left, so that the doubles add up as well
  const flops = part === parts - 1 ? kernel.flops - (kernel.flops / parts) * (parts - 1) : kernel.flops / parts;
  const tileSide = readBytes > 0 ? readBytes : writeBytes;
  const tiles = tileSide > 0 ? Math.ceil(tileSide / kernel.tileBytes) : flops > 0 ? die.engines : 0;
  const readSpan = regionBytes(kernel.read, readBytes, portion, die);
  const writeSpan = regionBytes(kernel.write, writeBytes, portion, die);
  const bases = memory.take(readSpan, writeSpan);
  if (bases === null) {
    throw new InputError({
      where: { file, line: kernel.line },
      found: `kernel '${kernel.name}' ranges over ${formatBytes(readSpan)} read and ${formatBytes(writeSpan)} written on one die`,
      expected: `no more than the memory of that die, ${formatBytes(die.capacity)}`,
      hint: 'give a smaller size or span, share the kernel over more dies, or use a package with more memory',
    });
  }
  return { readBase: bases.read, readSpan, writeBase: bases.write, writeSpan, tiles, readBytes, writeBytes, flops };
}

/** Bytes a pattern ranges over on one die: a whole number of its items. `portion` cuts a package-wide figure for this die. */
export function regionBytes(
  pattern: Pattern | null,
  bytes: number,
  portion: (total: number) => number,
  die: DieGeometry,
): number {
  if (pattern === null || bytes === 0) return 0;
  switch (pattern.name) {
    case 'sequential':
      return bytes;
    case 'strided': {
      // without a span one pass over as many strides as there are elements, or what half the memory holds of them
      const elements = Math.ceil(bytes / stridedElement(pattern, die.requestBytes));
      const wanted = pattern.span > 0 ? Math.ceil(portion(pattern.span) / pattern.stride) : elements;
      const most = Math.max(1, Math.floor(die.capacity / 2 / pattern.stride));
      return pattern.stride * Math.max(1, pattern.span > 0 ? wanted : Math.min(wanted, most));
    }
    case 'block': {
      const across = Math.max(1, Math.floor(pattern.pitch / pattern.width));
      const lineBytes = pattern.pitch * pattern.rows;
      const lines = Math.ceil(bytes / (pattern.rows * pattern.width * across));
      return lineBytes * Math.max(1, Math.min(lines, Math.floor(die.capacity / 2 / lineBytes)));
    }
    default: {
      const range = pattern.span > 0 ? portion(pattern.span) : bytes;
      return pattern.granule * Math.max(1, Math.ceil(range / pattern.granule));
    }
  }
}

/** Hands out regions of one die's range, one after another, and starts again when the end is reached. */
class RangeCursor {
  private readonly start: number;
  private readonly end: number;
  private next: number;
  private regions = 0; // handed out so far

  constructor(die: DieGeometry) {
    this.start = Math.ceil(die.base / PAGE) * PAGE;
    this.end = die.base + die.capacity;
    this.next = this.start;
  }

  /** Room for a read and a write region (either may be 0 bytes); null when the range cannot hold the two at once. */
  take(readSpan: number, writeSpan: number): { read: number; write: number } | null {
    let read = this.next;
    let write = this.after(read, readSpan, 0);
    if (write + writeSpan > this.end) {
      read = this.start;
      write = this.after(read, readSpan, 0);
      // without the free pages, if it is they that do not fit
      if (write + writeSpan > this.end) write = Math.ceil((read + readSpan) / PAGE) * PAGE;
      if (write + writeSpan > this.end) return null;
    }
    this.next = this.after(write, writeSpan, 1);
    this.regions += 2;
    if (this.next >= this.end) this.next = this.start;
    return { read, write };
  }

  /** First page after a region and its free pages. */
  private after(base: number, span: number, ahead: number): number {
    if (span === 0) return base;
    const gap = 1 + (((this.regions + ahead) * GAP_STEP) % GAP_PAGES);
    return Math.ceil((base + span) / PAGE + gap) * PAGE;
  }
}
