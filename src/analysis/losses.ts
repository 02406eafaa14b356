import { STACK_CLASSES, type StackClass } from '../engine/recording.js';
import type { KernelResult, Result } from './result-schema.js';

/** What a kernel's time went to beyond its bound. */
export type LossName = StackClass | 'other_kernels' | 'refresh_put_off';

export interface Loss {
  readonly name: LossName;
  readonly ps: number; // below 0 only for refresh that was put off
}

/** A kernel against its roofline bound and against the trace's own estimate. Times are of all its launches together. */
export interface Standing {
  readonly name: string;
  readonly boundBy: KernelResult['bound_by'];
  readonly durationPs: number;
  readonly boundPs: number; // the least time its bound allows
  readonly estimatePs: number | null;
  readonly timesBound: number; // duration over bound
  readonly timesEstimate: number | null;
  /** Adds up to duration less bound; longest first. */
  readonly losses: readonly Loss[];
  readonly verdict: 'holds' | 'too hopeful' | 'too careful' | 'below the bound' | null; // of the estimate; null: there is none
}

/** Classes that the bound itself holds, by what it is: the part of them it allows for is no loss. */
const ALLOWED: Readonly<Record<KernelResult['bound_by'], readonly StackClass[]>> = {
  dram: ['refresh'],
  link: ['starved_up_link', 'starved_down_link', 'starved_queue_credits'],
  compute: ['starved_compute'],
  none: [],
};

/**
 * Sets every kernel that ran against its bound and its estimate; `within`: how far off an estimate may be and still hold (0.1 is 10 %).
 *
 * The kernel's bandwidth stack says which share of the data buses' time went where while its requests were served; what is missing
 * to its whole duration on its stacks was spent on other kernels' requests. Data time is what the bytes need at peak; what the bound
 * is longer than that is taken off the classes it allows for, then off all alike.
 */
export function standings(result: Result, within: number): Standing[] {
  return result.kernels.filter((kernel) => kernel.duration_ps > 0).map((kernel) => standing(result, kernel, within));
}

function standing({ package: pkg }: Result, kernel: KernelResult, within: number): Standing {
  const [{ clockPs, organisation: o }] = pkg.memory;
  const { bandwidth_stack: stack, duration_ps: durationPs, estimate_ps: estimatePs } = kernel;
  const stacks = pkg.links.filter(({ die }) => kernel.dies.includes(pkg.dies[die].name)).length;
  const buses = stacks * o.channels * o.pseudo_channels;
  const boundPs = leastPs(kernel);

  // the share of the duration that each class took; of overlapping launches no more than all of it
  const perCk = clockPs / buses;
  const fit = stack.total * perCk > durationPs ? durationPs / stack.total : perCk;
  const ps = Object.fromEntries(STACK_CLASSES.map((name) => [name, stack[name] * fit])) as Record<StackClass, number>;
  const dataPs = ps.read_data + ps.write_data;
  let allowance = boundPs - dataPs;
  for (const name of ALLOWED[kernel.bound_by]) {
    const part = Math.max(0, Math.min(ps[name], allowance));
    ps[name] -= part;
    allowance -= part;
  }
  const losses: { name: LossName; ps: number }[] = STACK_CLASSES.filter(
    (name) => name !== 'read_data' && name !== 'write_data',
  ).map((name) => ({
    name,
    ps: ps[name],
  }));
  losses.push({ name: 'other_kernels', ps: durationPs - stack.total * fit });
  if (kernel.bound_by === 'dram') losses.push({ name: 'refresh_put_off', ps: -allowance });
  else scale(losses, allowance);

  const timesEstimate = estimatePs === null ? null : durationPs / estimatePs;
  return {
    name: kernel.name,
    boundBy: kernel.bound_by,
    durationPs,
    boundPs,
    estimatePs,
    timesBound: durationPs / boundPs,
    timesEstimate,
    losses: losses.filter((loss) => Math.abs(loss.ps) > 1e-9 * durationPs).sort((a, b) => b.ps - a.ps),
    verdict:
      estimatePs === null || timesEstimate === null ? null : verdictOf(timesEstimate, estimatePs, boundPs, within),
  };
}

/**
 * Takes what the bound still allows for off all losses alike: while engines compute, or a link is busy, the data buses wait in many
 * ways, and none of that is lost as long as it hides behind the bound.
 */
function scale(losses: { ps: number }[], allowance: number): void {
  const all = losses.reduce((sum, loss) => sum + loss.ps, 0);
  if (all <= 0) return;
  for (const loss of losses) loss.ps *= (all - allowance) / all;
}

/** The least time the kernel's bound allows it, ps. */
function leastPs(kernel: KernelResult): number {
  const { flops, bound_flops_per_s: rate, moved_bytes: bytes, bound_bytes_per_s: bandwidth } = kernel;
  if (rate !== null && rate > 0) return (flops / rate) * 1e12;
  return (bytes / bandwidth) * 1e12;
}

function verdictOf(times: number, estimatePs: number, boundPs: number, within: number): Standing['verdict'] {
  if (Math.abs(times - 1) <= within) return 'holds';
  if (times < 1) return 'too careful';
  return estimatePs < boundPs * (1 - within) ? 'below the bound' : 'too hopeful';
}
