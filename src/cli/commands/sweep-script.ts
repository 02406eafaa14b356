/** `penstock sweep script`: a Slurm job array that runs a sweep, one slice a task. */
import { basename, relative, resolve } from 'node:path';
import { InputError } from '../../errors.js';
import { dealt } from '../../study/index.js';
import { command, wholeNumber } from '../command.js';
import { OUT, PLAN } from '../sweep-options.js';
import { folderOf, planned } from '../sweep-plan.js';

const NO_QUESTIONS = { pareto: [], cost: undefined, need: [] };

export const sweepScript = command({
  usage: 'script <plan>',
  about: 'print a Slurm job-array script that runs a sweep',
  positionals: PLAN,
  options: {
    ...OUT,
    tasks: { type: 'string', demandOption: true, requiresArg: true, describe: 'tasks of the array, one slice each' },
    workers: { type: 'string', default: '1', requiresArg: true, describe: 'runs side by side in a task: its cores' },
    sbatch: {
      type: 'string',
      array: true,
      requiresArg: true,
      default: [] as string[],
      defaultDescription: 'nothing',
      describe: 'a further option of the job, for example --sbatch=--partition=long; may be given again',
    },
  },
  examples: [
    ['sweep script configs/wagtail-sweep.yaml --tasks 8 > sweep.sh', 'then: sbatch sweep.sh'],
    [
      'sweep script configs/wagtail-sweep.yaml --tasks 4 --workers 16 --sbatch=--time=2:00:00',
      'four tasks of sixteen cores, two hours at most',
    ],
  ],
  main: async (args, session) => {
    const tasks = wholeNumber('--tasks', args.tasks, 1);
    const workers = wholeNumber('--workers', args.workers, 1);
    const { points, costs } = await planned(args.plan, NO_QUESTIONS, session);
    if (tasks > points.length) {
      throw new InputError({
        where: { file: '--tasks' },
        found: `${tasks} tasks for ${points.length} points`,
        expected: 'a point for each task, or more',
      });
    }
    for (const option of args.sbatch) {
      if (/^--?[A-Za-z]/.test(option) && !/[\r\n]/.test(option)) continue;
      throw new InputError({
        where: { file: '--sbatch' },
        found: `'${option}'`,
        expected: 'an option of sbatch, for example --time=2:00:00',
      });
    }
    const out = folderOf(args.plan, args.out);
    const name = basename(out).replace(/\.sweep$/, '');
    const penstock = [process.execPath, resolve(process.argv[1] ?? '')].map(quoted).join(' ');
    const words = [quoted(relative(process.cwd(), resolve(args.plan))), '--out', quoted(out)].join(' ');
    const sums = dealt(costs, tasks).map((slice) => slice.reduce((sum, point) => sum + costs[point], 0));
    const spread = Math.max(...sums) / (sums.reduce((sum, cost) => sum + cost, 0) / tasks);
    const job = `penstock-${name.replaceAll(/[^\w.-]/g, '_')}`;
    await session.print(`#!/bin/bash
# ${points.length} runs in ${tasks} tasks; the longest task has about ${spread.toFixed(2)} times the mean work.
# Submit it:                   id=$(sbatch --parsable THIS_FILE)
# Join when all have ended:    sbatch --dependency=afterany:$id --output=${job}-merge.log --wrap ${quoted(`cd ${quoted(process.cwd())} && ${penstock} sweep merge ${words}`)}
# A task that was killed is submitted again as it was (sbatch --array=3 THIS_FILE): finished points are not run twice.
#SBATCH --job-name=${job}
#SBATCH --array=1-${tasks}
#SBATCH --ntasks=1
#SBATCH --cpus-per-task=${workers}
#SBATCH --requeue
#SBATCH --open-mode=append
#SBATCH --output=${job}-%A_%a.log
${args.sbatch.map((option) => `#SBATCH ${option}\n`).join('')}set -euo pipefail
cd ${quoted(process.cwd())}
exec ${penstock} sweep ${words} --workers ${workers} --shard "$SLURM_ARRAY_TASK_ID/${tasks}"
`);
  },
});

/** A word for the shell, as it stands. */
function quoted(word: string): string {
  return /^[\w@%+=:,./-]+$/.test(word) ? word : `'${word.replaceAll("'", "'\\''")}'`;
}
