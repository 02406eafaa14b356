import { STACK_CLASSES, type StackClass } from '../engine/recording.js';
import { formatBandwidth, formatPercent } from '../units.js';
import type { Verdict } from './result-schema.js';

// where a sentence changes its mind; common practice, no source
const AT_BOUND = 0.9; // of a ceiling: nearer than this, the ceiling itself is what binds
const COMPUTE_LEADS = 0.7; // engines computing for this share of the time bind before memory does
const LEADING_SHARE = 0.25; // of all clocks: a cause smaller than this explains too little to be named alone
const LEADING_FACTOR = 1.5; // and it must be this much larger than the next

/** What a loss is called in a sentence, and what that means. Names in the stack itself stay the classes'. */
const CAUSES: Readonly<
  Record<Exclude<StackClass, 'read_data' | 'write_data'>, readonly [name: string, meaning: string]>
> = {
  refresh: ['refresh', 'no data moves while banks are refreshed'],
  row_cycle: ['the row cycle', 'rows had to be closed and opened before data could move'],
  activate_window: ['the activate window', 'tRRD and tFAW held back the next row'],
  column_gap: ['column gaps', 'accesses that follow each other in one bank group are tCCD_L apart'],
  turnaround: ['bus turnaround', 'the data bus changed between reads and writes'],
  command_bus: ['the command bus', 'it was taken when the next command was due'],
  starved_down_link: ['the down links', 'requests and write data queued for them'],
  starved_up_link: ['the up links', 'reads waited for room to land their data'],
  starved_queue_credits: ['queue credits', 'requests waited for room in the queue of their channel'],
  starved_window: ['the request window', 'the engines had as many requests outstanding as they may'],
  starved_compute: ['compute', 'loads waited until earlier tiles were computed'],
  starved_imbalance: ['imbalance', 'some channels had work left when others had none'],
  starved_arrivals: ['arrivals', 'the trace asked for no more at the time'],
  starved_drain: ['the drain at the end', 'the work had run out'],
};

/** The figures the verdict is derived from. */
export interface Standing {
  readonly partial: boolean;
  readonly achieved: number; // bytes a second
  readonly bound: number; // bytes a second
  readonly limit: 'dram' | 'link';
  readonly computeUtilization: number; // 0 … 1
  /** The bandwidth stack, ck by class of STACK_CLASSES; all 0 when it was not kept. */
  readonly stack: readonly number[];
}

/**
 * The sentence that says what binds and how far from the bound: a ceiling that is nearly reached, else compute when the engines
 * were busy nearly always, else the largest cause in the bandwidth stack when one stands out, else that none does.
 */
export function verdict(standing: Standing): Verdict {
  const said = judge(standing);
  return standing.partial ? { ...said, sentence: `Stopped before the trace ended; so far: ${said.sentence}` } : said;
}

function judge({ achieved, bound, limit, computeUtilization, stack }: Standing): Verdict {
  if (achieved === 0) {
    return { sentence: 'Nothing binds: no byte crossed a DRAM data bus.', binds: 'nothing', distance_ratio: 0 };
  }
  const distance = achieved / bound;
  const ceiling = limit === 'link' ? 'link payload ceiling' : 'refresh-derated DRAM peak';
  // refresh may be postponed past the end of a short run, which then beats the long-run ceiling
  const above = distance > 1 && limit === 'dram' ? ' (refreshes were postponed)' : '';
  const standing = `${formatBandwidth(achieved)} is ${formatPercent(distance)} of the ${ceiling}${above}`;
  if (distance >= AT_BOUND) {
    const what = limit === 'link' ? 'Link bandwidth' : 'DRAM bandwidth';
    return { sentence: `${what} binds: ${standing}.`, binds: limit, distance_ratio: distance };
  }
  if (computeUtilization >= COMPUTE_LEADS) {
    const sentence = `Compute binds: the engines computed for ${formatPercent(computeUtilization)} of the time; ${standing}.`;
    return { sentence, binds: 'compute', distance_ratio: computeUtilization };
  }

  const total = stack.reduce((sum, ck) => sum + ck, 0);
  const losses = STACK_CLASSES.map((name, i) => ({ name, share: total === 0 ? 0 : stack[i] / total }))
    .filter((loss): loss is { name: keyof typeof CAUSES; share: number } => loss.name in CAUSES && loss.share > 0)
    .sort((a, b) => b.share - a.share);
  const [first, second] = losses;
  if (first === undefined)
    return { sentence: `What binds was not recorded: ${standing}.`, binds: 'nothing', distance_ratio: distance };
  if (first.share >= LEADING_SHARE && (second === undefined || first.share >= LEADING_FACTOR * second.share)) {
    const [name, meaning] = CAUSES[first.name];
    const sentence = `What binds most: ${name} (${meaning}), ${formatPercent(first.share)} of the DRAM clocks; ${standing}.`;
    return { sentence, binds: first.name, distance_ratio: distance };
  }
  const leading = losses.slice(0, 3).map(({ name, share }) => `${CAUSES[name][0]} (${formatPercent(share)})`);
  return {
    sentence: `No single limit dominates: ${standing}; most DRAM clocks were lost to ${listed(leading)}.`,
    binds: 'nothing',
    distance_ratio: distance,
  };
}

function listed(items: readonly string[]): string {
  if (items.length < 2) return items.join('');
  return `${items.slice(0, -1).join(', ')} and ${items[items.length - 1]}`;
}
