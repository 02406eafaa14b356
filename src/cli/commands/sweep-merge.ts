/** `penstock sweep merge`: joins the slices of a sweep once all its points are there. */

import { InputError } from '../../errors.js';
import { VERSION } from '../../index.js';
import { sweepReport } from '../../report/index.js';
import { tableOf } from '../../study/index.js';
import { command } from '../command.js';
import { Journal } from '../sweep-journal.js';
import { codeOf, OUT, PLAN, QUESTIONS } from '../sweep-options.js';
import { folderOf, planned } from '../sweep-plan.js';
import { writeTables } from '../sweep-tables.js';

export const sweepMerge = command({
  usage: 'merge <plan>',
  about: 'join the slices of a sweep: the same files as one machine writes',
  positionals: PLAN,
  options: {
    ...OUT,
    from: {
      type: 'string',
      array: true,
      requiresArg: true,
      default: [] as string[],
      defaultDescription: 'nothing but --out',
      describe: 'another folder with points of this sweep; may be given again',
    },
    ...QUESTIONS,
  },
  examples: [
    ['sweep merge configs/wagtail-sweep.yaml', 'slices that were run into one folder'],
    ['sweep merge configs/wagtail-sweep.yaml --from node1.sweep --from node2.sweep', 'slices from several folders'],
  ],
  main: async (args, session) => {
    const whole = await planned(args.plan, args, session);
    const folder = folderOf(args.plan, args.out);
    const journal = new Journal(folder, whole.header);
    for (const other of args.from) journal.take(other);
    const missing = journal.missing();
    if (missing.length > 0) {
      throw new InputError({
        where: { file: folder },
        found: `${whole.points.length - missing.length} of ${whole.points.length} points; missing: ${ranges(missing)}`,
        expected: 'all of them',
        hint: `Run the missing slices again, or penstock sweep ${args.plan} --out ${folder} for all that is missing`,
      });
    }
    journal.prepare();
    journal.join();
    const records = journal.records();
    const table = tableOf(whole.plan, records, VERSION, whole.points.length);
    const files = await writeTables(folder, table);
    await session.print(`${sweepReport(table, session)}Results: ${folder}/ (sweep.jsonl, ${files.join(', ')})\n`);
    session.exitCode = codeOf(records);
  },
});

const MOST_RANGES = 12;

/** 0, 1, 2, 5 as '0-2, 5'. */
function ranges(points: readonly number[]): string {
  const parts: [from: number, to: number][] = [];
  for (const point of points) {
    const last = parts[parts.length - 1];
    if (last !== undefined && last[1] === point - 1) last[1] = point;
    else parts.push([point, point]);
  }
  const words = parts.slice(0, MOST_RANGES).map(([from, to]) => (from === to ? String(from) : `${from}-${to}`));
  return words.join(', ') + (parts.length > MOST_RANGES ? ' and more' : '');
}
