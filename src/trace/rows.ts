/**
 * Reads CSV rows with their line numbers: records.ts finds the records, fast-csv their cells. Memory holds one chunk's rows at a
 * time: the next chunk is read when the rows of the last have been taken.
 *
 * fast-csv pads short rows and gives up at long ones when it is told the header, so it is not: rows come as they are, and whoever
 * reads them compares their length.
 */
import { type ParserOptionsArgs, parse } from 'fast-csv';
import type { InputError } from '../errors.js';
import { Splitter, splitRecords } from './records.js';

/** The rows of one chunk, and the fault that follows the last of them, if any. */
export interface RowBlock {
  readonly rows: readonly (readonly string[])[]; // cells of each row
  readonly lines: readonly number[]; // line each row begins on; negative when the row has quotes
  readonly fault: InputError | null;
  readonly fatal: boolean; // nothing after the fault can be read
}

const PIECE = 16384; // bytes given to fast-csv at a time: it is quickest on small pieces

/** Rows of `source`, from its beginning. */
export async function* readRows(
  source: AsyncIterable<Buffer>,
  file: string,
  delimiter = ',',
): AsyncGenerator<RowBlock> {
  const cells = new CellReader(file, delimiter);
  try {
    for await (const { text, lines, fault, fatal } of splitRecords(
      inPieces(source),
      file,
      new Splitter(file, delimiter),
    ))
      yield { rows: await cells.read(text, lines), lines, fault, fatal };
  } finally {
    cells.close();
  }
}

/** fast-csv, asked for the cells of some records at a time. */
export class CellReader {
  private readonly csv;
  private failure: Error | null = null;
  private wake: () => void = () => {};

  constructor(
    private readonly file: string,
    delimiter: string,
  ) {
    const options: ParserOptionsArgs = { headers: false, ignoreEmpty: false, delimiter };
    this.csv = parse(options);
    this.csv.on('readable', () => this.wake());
    this.csv.on('error', (error) => {
      this.failure = error;
      this.wake();
    });
  }

  /** Cells of the whole records in `text`, which begin on `lines`. */
  async read(text: string, lines: readonly number[]): Promise<string[][]> {
    const rows: string[][] = [];
    let taken = text === '';
    if (!taken) {
      this.csv.write(text, () => {
        taken = true;
        this.wake();
      });
    }
    for (;;) {
      const row = this.csv.read() as string[] | null;
      if (row !== null) rows.push(row);
      else if (this.failure !== null) throw this.failure;
      else if (taken) break;
      else
        await new Promise<void>((resolve) => {
          this.wake = resolve;
        });
    }
    if (rows.length === lines.length) return rows;
    throw new Error(`${this.file}: ${lines.length} records were read as ${rows.length} rows near line ${lines.at(-1)}`);
  }

  close(): void {
    this.csv.destroy();
  }
}

/** Cuts bytes to the size fast-csv is quickest with. */
export function* pieces(bytes: Buffer): Generator<Buffer> {
  for (let at = 0; at < bytes.length; at += PIECE) yield bytes.subarray(at, at + PIECE);
}

async function* inPieces(source: AsyncIterable<Buffer>): AsyncGenerator<Buffer> {
  for await (const chunk of source) yield* pieces(chunk);
}
