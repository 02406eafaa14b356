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

/** Rows of `source`, from where `splitter` stands. */
export async function* readRows(
  source: AsyncIterable<Buffer>,
  file: string,
  delimiter = ',',
  splitter: Splitter = new Splitter(file, delimiter),
): AsyncGenerator<RowBlock> {
  const options: ParserOptionsArgs = { headers: false, ignoreEmpty: false, delimiter };
  const csv = parse(options);
  let failure: Error | null = null;
  let wake: () => void = () => {};
  csv.on('readable', () => wake());
  csv.on('error', (error) => {
    failure = error;
    wake();
  });
  try {
    for await (const { text, lines, fault, fatal } of splitRecords(inPieces(source), file, splitter)) {
      const rows: string[][] = [];
      let taken = text === '';
      if (!taken) {
        csv.write(text, () => {
          taken = true;
          wake();
        });
      }
      for (;;) {
        const row = csv.read() as string[] | null;
        if (row !== null) rows.push(row);
        else if (failure !== null) throw failure;
        else if (taken) break;
        else await new Promise<void>((resolve) => (wake = resolve));
      }
      if (rows.length !== lines.length) {
        throw new Error(`${file}: ${lines.length} records were read as ${rows.length} rows near line ${lines.at(-1)}`);
      }
      yield { rows, lines, fault, fatal };
    }
  } finally {
    csv.destroy();
  }
}

async function* inPieces(source: AsyncIterable<Buffer>): AsyncGenerator<Buffer> {
  for await (const chunk of source)
    for (let at = 0; at < chunk.length; at += PIECE) yield chunk.subarray(at, at + PIECE);
}
