/** Kernel-trace rows to kernels: every cell checked, sizes in bytes, patterns understood. */
import { parseBytes, parseFlops } from '../units.js';
import type { DieGeometry, Kernel, KernelTrace, Pattern } from './batch.js';
import type { FileHash } from './bytes.js';
import { Cells } from './cells.js';
import type { Header } from './header.js';
import { parsePattern, SEQUENTIAL } from './pattern.js';
import type { RowBlock } from './rows.js';
import { noRows, type Tolerance } from './tolerance.js';

/** Bytes of a tile when the trace does not say: what a few hundred kilobytes of on-die buffer hold twice. No source. */
export const DEFAULT_TILE = 65536;
/** Largest size of one side of a kernel, bytes: the address space. */
const LARGEST_SIDE = 2 ** 52;
const MOST_FLOPS = 1e30;
const MOST_LAUNCHES = 2 ** 31 - 1;
const MOST_ESTIMATE_US = 9e9; // 2^53 ps

/** Reads all rows of a kernel trace. `hash` is asked for at the end, when all bytes have been seen. */
export async function readKernels(
  file: string,
  header: Header,
  blocks: AsyncIterable<RowBlock>,
  tolerance: Tolerance,
  dieNames: readonly string[],
  geometry: readonly DieGeometry[],
  hash: FileHash,
): Promise<KernelTrace> {
  const rows = new KernelRows(file, header, dieNames, geometry);
  const kernels: Kernel[] = [];
  for await (const block of blocks) {
    block.rows.forEach((row, i) => {
      try {
        kernels.push(rows.read(row, block.lines[i]));
      } catch (error) {
        tolerance.skip(error);
      }
    });
    if (block.fault !== null && block.fatal) throw block.fault;
    if (block.fault !== null) tolerance.skip(block.fault);
  }
  if (kernels.length === 0) throw noRows(file, tolerance.skipped);
  const facts = { rows: kernels.length, skippedRows: tolerance.skipped, hash: await hash.hex() };
  return { kind: 'kernel', file, streams: rows.streams, kernels, facts };
}

class KernelRows {
  readonly streams: string[] = [];
  private readonly cells: Cells;
  private readonly at;

  constructor(
    file: string,
    header: Header,
    private readonly dieNames: readonly string[],
    private readonly geometry: readonly DieGeometry[],
  ) {
    this.cells = new Cells(file, header);
    const position = (name: string) => this.cells.position(name);
    this.at = {
      kernel: position('kernel'),
      stream: position('stream'),
      format: position('format'),
      flops: position('flops'),
      read: position('read'),
      write: position('write'),
      readPattern: position('read_pattern'),
      writePattern: position('write_pattern'),
      tile: position('tile'),
      die: position('die'),
      repeat: position('repeat'),
      estimate: position('estimate_us'),
    };
  }

  read(row: readonly string[], line: number): Kernel {
    const { cells, at } = this;
    cells.enter(row, line);
    const name = cells.text(at.kernel);
    if (name === '') throw cells.fault(at.kernel, 'the name of the kernel', 'any text will do');
    const flops = this.flops();
    const readBytes = this.size(at.read, 0);
    const writeBytes = this.size(at.write, 0);
    if (flops === 0 && readBytes === 0 && writeBytes === 0) {
      throw cells.fault(
        at.read,
        'a kernel that reads, writes or computes something',
        'remove the row',
        'flops, read and write all 0',
      );
    }
    const format = cells.text(at.format);
    if (format === '' && flops > 0) {
      throw cells.fault(at.format, 'the number format of the flops', 'fp8, bf16, … as the package names it');
    }
    const tileBytes = this.size(at.tile, DEFAULT_TILE);
    if (tileBytes === 0)
      throw cells.fault(at.tile, 'a tile of at least 1 B', `leave it empty for ${DEFAULT_TILE / 1024} KiB`);
    const dieCount = this.geometry.length || this.dieNames.length || 1024;
    const die = cells.text(at.die) === '' ? -1 : cells.die(at.die, this.dieNames, dieCount);
    const repeat =
      cells.text(at.repeat) === '' ? 1 : cells.whole(at.repeat, 1, MOST_LAUNCHES, 'launches, one after the other');
    const estimateUs =
      cells.text(at.estimate) === ''
        ? 0
        : cells.decimal(at.estimate, 'the time of one launch in microseconds', MOST_ESTIMATE_US);
    const read = this.pattern(at.readPattern, readBytes);
    const write = this.pattern(at.writePattern, writeBytes);
    return {
      name,
      line: Math.abs(line),
      stream: this.stream(), // last, so that a bad row leaves no stream behind
      format: flops > 0 ? format : '',
      flops,
      readBytes,
      writeBytes,
      read,
      write,
      tileBytes,
      die,
      repeat,
      estimatePs: Math.round(estimateUs * 1e6),
    };
  }

  /** Number of the row's stream; an empty cell is the stream 'main'. */
  private stream(): number {
    const name = this.cells.text(this.at.stream) || 'main';
    const known = this.streams.indexOf(name);
    return known >= 0 ? known : this.streams.push(name) - 1;
  }

  private size(position: number, empty: number): number {
    const text = this.cells.text(position);
    if (text === '') return empty;
    if (text === '0') return 0;
    const bytes = parseBytes(text, this.cells.where(position));
    if (Number.isInteger(bytes) && bytes >= 0 && bytes <= LARGEST_SIDE) return bytes;
    throw this.cells.fault(position, 'a whole number of bytes up to 4 PiB', 'for example 64 MiB or 48000 B');
  }

  private flops(): number {
    const text = this.cells.text(this.at.flops);
    if (text === '') return 0;
    const flops = parseFlops(text, this.cells.where(this.at.flops));
    if (flops >= 0 && flops <= MOST_FLOPS) return flops;
    throw this.cells.fault(
      this.at.flops,
      'floating-point operations of one launch, from 0 up',
      'for example 2.5 GFLOP or 2.5e9',
    );
  }

  /** The pattern of a side; of a side that moves nothing it is checked, and there is none. */
  private pattern(position: number, bytes: number): Pattern | null {
    const text = this.cells.text(position);
    const pattern = text === '' ? SEQUENTIAL : parsePattern(text, this.cells.where(position));
    return bytes > 0 ? pattern : null;
  }
}
