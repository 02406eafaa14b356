/** Which slice of a sweep this process is to run. */
import { InputError } from '../errors.js';
import type { Shard } from './cost.js';

/** `k/n`, k from 1 to n. Throws InputError. */
export function parseShard(text: string): Shard {
  const [, k, n] = /^(\d{1,7})\/(\d{1,7})$/.exec(text.trim()) ?? [];
  if (Number(n) >= 1 && Number(k) >= 1 && Number(k) <= Number(n)) return { k: Number(k), n: Number(n) };
  throw new InputError({
    where: { file: '--shard' },
    found: `'${text}'`,
    expected: 'k/n with k from 1 to n, for example 3/8',
  });
}

/**
 * The slice of a task of a Slurm job array, from the variables Slurm gives it; null outside an array. The array must be whole: of
 * an array that begins elsewhere than 0 or 1, or has steps, the number of slices cannot be told. Throws InputError.
 */
export function slurmShard(env: Readonly<Record<string, string | undefined>>): Shard | null {
  const {
    SLURM_ARRAY_TASK_ID: id,
    SLURM_ARRAY_TASK_COUNT: count,
    SLURM_ARRAY_TASK_MIN: min,
    SLURM_ARRAY_TASK_MAX: max,
  } = env;
  if (id === undefined) return null;
  const [k, n, from, to] = [id, count, min, max].map(Number);
  if ((from === 0 || from === 1) && to - from + 1 === n && k >= from && k <= to) return { k: k - from + 1, n };
  throw new InputError({
    where: { file: 'SLURM_ARRAY_TASK_ID' },
    found: `task ${id} of an array from ${min ?? '?'} to ${max ?? '?'} with ${count ?? '?'} tasks`,
    expected: 'an array without gaps that begins at 0 or 1',
    hint: 'Give the slice yourself, for example --shard "$SLURM_ARRAY_TASK_ID/8"; when some tasks of an array are submitted again, this is the way',
  });
}
