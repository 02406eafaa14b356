/** `penstock sweep`: every point of a plan, over all cores, resumable; then the tables and what they say. */
import { VERSION } from '../../index.js';
import { sweepReport } from '../../report/index.js';
import { dealt, type PointRecord, parseShard, type Shard, slurmShard, tableOf } from '../../study/index.js';
import { command, wholeNumber } from '../command.js';
import { INTERRUPTED } from '../failure.js';
import type { Session } from '../session.js';
import { Journal } from '../sweep-journal.js';
import { codeOf, OUT, PLAN, QUESTIONS } from '../sweep-options.js';
import { folderOf, planned } from '../sweep-plan.js';
import { runMissing } from '../sweep-run.js';
import { writeTables } from '../sweep-tables.js';
import { sweepMerge } from './sweep-merge.js';
import { sweepScript } from './sweep-script.js';

export const sweep = command({
  usage: 'sweep <plan>',
  about: 'run a grid of packages and traces over all cores, resumable',
  positionals: PLAN,
  options: {
    ...OUT,
    workers: { type: 'string', requiresArg: true, defaultDescription: 'all cores', describe: 'runs side by side' },
    shard: {
      type: 'string',
      requiresArg: true,
      defaultDescription: 'that of a Slurm array task, else 1/1',
      describe: 'run only slice k of n, k/n; sweep merge joins them',
    },
    ...QUESTIONS,
  },
  subcommands: [sweepMerge, sweepScript],
  examples: [
    ['sweep configs/wagtail-sweep.yaml', 'all points; again the same after an interrupt goes on'],
    [
      "sweep configs/wagtail-sweep.yaml --need 'bandwidth.achieved_bytes_per_s >= 2.5 TB/s'",
      'the cheapest package that reaches it',
    ],
    ['sweep configs/wagtail-sweep.yaml --shard 1/4 --workers 2', 'a quarter of it, on this machine'],
    ['sweep merge configs/wagtail-sweep.yaml', 'joins the slices'],
    ['sweep script configs/wagtail-sweep.yaml --tasks 8 > sweep.sh', 'a Slurm job array'],
  ],
  main: async (args, session) => {
    const workers = args.workers === undefined ? undefined : wholeNumber('--workers', args.workers, 1);
    const shard = args.shard === undefined ? slurmShard(process.env) : parseShard(args.shard);
    const whole = await planned(args.plan, args, session);
    const folder = folderOf(args.plan, args.out);

    const journal = new Journal(folder, whole.header);
    const slice = shard === null ? whole.points.map((_, i) => i) : (dealt(whole.costs, shard.n)[shard.k - 1] ?? []);
    const wanted = slice.filter((point) => !journal.has(point));

    // the folder is tried before anything is run
    journal.open(shard === null ? '' : `${shard.k}-of-${shard.n}-`);
    if (wanted.length > 0) await runMissing(whole, journal, wanted, workers, session);
    journal.close();

    const records = journal.records();
    const table = tableOf(whole.plan, records, VERSION, whole.points.length);
    if (session.signal.aborted) {
      session.exitCode = INTERRUPTED;
      await session.print(sweepReport(table, session));
      session.warn(`penstock: interrupted; ${folder} keeps ${records.length} of ${whole.points.length} points`);
      return;
    }
    if (shard !== null && shard.n > 1) await sliceReport(slice, records, shard, folder, session);
    else {
      journal.join();
      const files = await writeTables(folder, table);
      await session.print(`${sweepReport(table, session)}Results: ${folder}/ (sweep.jsonl, ${files.join(', ')})\n`);
    }
    session.exitCode = codeOf(records.filter(({ point }) => slice.includes(point)));
  },
});

async function sliceReport(
  slice: readonly number[],
  records: readonly PointRecord[],
  { k, n }: Shard,
  folder: string,
  session: Session,
): Promise<void> {
  const own = new Set(slice);
  const failed = records.filter(({ point, status }) => own.has(point) && status === 'failed').length;
  const some = failed > 0 ? `, ${failed} of them failed` : '';
  await session.print(
    `Slice ${k} of ${n}: ${slice.length} points done${some}, in ${folder}/; sweep merge joins them\n`,
  );
}
