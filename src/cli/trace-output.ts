/** Access traces as files: the form by the name's ending, whole or not at all, with progress. */
import { InputError } from '../errors.js';
import { type AccessBatch, accessCsv, arrowBytes, parquetBytes, zstd } from '../trace/index.js';
import { INTERRUPTED } from './failure.js';
import { type Kind, OutputFile } from './output.js';
import { RowProgress } from './row-progress.js';
import type { Session } from './session.js';

const FORM = /\.(csv|csv\.gz|csv\.zst|parquet|arrow)$/i;
const KIND_OF: Readonly<Record<string, Kind>> = { parquet: 'parquet', arrow: 'arrow', 'csv.zst': 'zstd' };
export const FORMS = '.csv, .csv.gz, .csv.zst, .parquet, .arrow';

/** The form a name asks for; '-' is CSV on standard output. Throws InputError. */
export function formOfOutput(file: string): string {
  const form = file === '-' ? 'csv' : FORM.exec(file)?.[1].toLowerCase();
  if (form !== undefined) return form;
  throw new InputError({
    where: { file },
    found: 'a name that says no form',
    expected: `one that ends in ${FORMS.replace(/, (?=[^,]*$)/, ' or ')}`,
  });
}

/**
 * Writes batches to a file, or as CSV to standard output ('-'). `names`: of the kernels, null to leave the column out. `fraction`: how
 * much of the work is done, for progress. Returns the rows written, or null when an interrupt came first and nothing was.
 */
export async function writeTrace(
  file: string,
  batches: AsyncIterable<AccessBatch> | Iterable<AccessBatch>,
  names: readonly string[] | null,
  session: Session,
  fraction: () => number,
): Promise<number | null> {
  const form = formOfOutput(file);
  const progress = RowProgress.on(process.stderr, fraction);
  let rows = 0;
  async function* wanted(): AsyncGenerator<AccessBatch> {
    for await (const batch of batches) {
      rows += batch.count;
      progress?.show(rows);
      if ((await session.breathe()) || !session.heard) return;
      yield batch;
    }
  }
  try {
    if (file === '-') {
      for await (const text of accessCsv(wanted(), names)) await session.print(text);
    } else {
      const output = new OutputFile(file, KIND_OF[form] ?? 'accessTrace');
      for await (const piece of inForm(form, wanted(), names, file)) output.write(piece);
      if (session.signal.aborted) output.discard();
      else output.commit();
    }
  } finally {
    progress?.stop();
  }
  if (!session.signal.aborted) return rows;
  session.exitCode = INTERRUPTED;
  return null;
}

function inForm(
  form: string,
  batches: AsyncIterable<AccessBatch>,
  names: readonly string[] | null,
  file: string,
): AsyncIterable<string | Uint8Array> {
  if (form === 'parquet') return parquetBytes(batches, names);
  if (form === 'arrow') return arrowBytes(batches, names);
  const text = accessCsv(batches, names);
  return form === 'csv.zst' ? zstd(text, file) : text;
}
