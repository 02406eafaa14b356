import { STACK_CLASSES, type StackClass } from '../engine/recording.js';
import { formatBandwidth, formatPercent } from '../units.js';
import type { Verdict } from './result-schema.js';
import type { Standing } from './standing.js';

// where a sentence changes its mind; common practice, no source
const AT_BOUND = 0.9; // of a ceiling, or of the time of a link or an engine: nearer than this, that itself is what binds
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

/**
 * The sentence that says what binds and how far from the bound: a ceiling of the stacks in use that is nearly reached; else compute
 * when the engines were busy nearly always; else a link that was (short requests fill it with headers, far below its payload
 * ceiling); else one engine that was; else the largest cause in the bandwidth stack when one stands out; else that none does.
 */
export function verdict(standing: Standing): Verdict {
  const said = judge(standing);
  return standing.partial ? { ...said, sentence: `Stopped before the trace ended; so far: ${said.sentence}` } : said;
}

function judge(standing: Standing): Verdict {
  const { achieved, bound, limit, computeUtilization, busiestEngine, busiestLink } = standing;
  if (achieved === 0) {
    return { sentence: 'Nothing binds: no byte crossed a DRAM data bus.', binds: 'nothing', distance_ratio: 0 };
  }
  const distance = achieved / bound;
  const reached = howFar(standing, distance);
  if (distance >= AT_BOUND) {
    const what = limit === 'link' ? 'Link bandwidth' : 'DRAM bandwidth';
    return { sentence: `${what} binds: ${reached}.`, binds: limit, distance_ratio: distance };
  }
  if (computeUtilization >= COMPUTE_LEADS) {
    const sentence = `Compute binds: the engines computed for ${formatPercent(computeUtilization)} of the time; ${reached}.`;
    return { sentence, binds: 'compute', distance_ratio: computeUtilization };
  }
  if (busiestLink.utilization >= AT_BOUND) {
    const { name, direction, utilization } = busiestLink;
    const others = standing.linksAlike > 1 ? ` and ${standing.linksAlike - 1} more nearly as long` : '';
    const busy = `the ${direction} link of ${name} was busy for ${formatPercent(utilization)} of the time${others}`;
    return { sentence: `Link bandwidth binds: ${busy}; ${reached}.`, binds: 'link', distance_ratio: distance };
  }
  if (busiestEngine >= AT_BOUND) {
    const busy = `one computed for ${formatPercent(busiestEngine)} of the time, all for ${formatPercent(computeUtilization)}`;
    const sentence = `Compute binds on some engines: ${busy}; ${reached}.`;
    return { sentence, binds: 'compute', distance_ratio: computeUtilization };
  }
  return judgeLosses(standing, distance, reached);
}

function judgeLosses({ stack, stacks, stacksInUse }: Standing, distance: number, reached: string): Verdict {
  const total = stack.reduce((sum, ck) => sum + ck, 0);
  const clocks = stacksInUse < stacks ? 'DRAM clocks of the stacks in use' : 'DRAM clocks';
  const losses = STACK_CLASSES.map((name, i) => ({ name, share: total === 0 ? 0 : stack[i] / total }))
    .filter((loss): loss is { name: keyof typeof CAUSES; share: number } => loss.name in CAUSES && loss.share > 0)
    .sort((a, b) => b.share - a.share);
  const [first, second] = losses;
  if (first === undefined)
    return { sentence: `What binds was not recorded: ${reached}.`, binds: 'nothing', distance_ratio: distance };
  if (first.share >= LEADING_SHARE && (second === undefined || first.share >= LEADING_FACTOR * second.share)) {
    const [name, meaning] = CAUSES[first.name];
    const sentence = `What binds most: ${name} (${meaning}), ${formatPercent(first.share)} of the ${clocks}; ${reached}.`;
    return { sentence, binds: first.name, distance_ratio: distance };
  }
  const leading = losses.slice(0, 3).map(({ name, share }) => `${CAUSES[name][0]} (${formatPercent(share)})`);
  const sentence = `No single limit dominates: ${reached}; the largest losses of ${clocks} are ${listed(leading)}.`;
  return { sentence, binds: 'nothing', distance_ratio: distance };
}

/** How far the achieved bandwidth is from its bound, as a clause. */
function howFar({ achieved, limit, stacks, stacksInUse }: Standing, distance: number): string {
  const ceiling = limit === 'link' ? 'link payload ceiling' : 'refresh-derated DRAM peak';
  const part = stacksInUse < stacks ? ` of the ${stacksInUse} of ${stacks} stacks in use` : '';
  // refresh may be postponed past the end of a short run, which then beats the long-run ceiling
  const above = distance > 1 && limit === 'dram' ? ' (refreshes were postponed)' : '';
  return `${formatBandwidth(achieved)} is ${formatPercent(distance)} of the ${ceiling}${part}${above}`;
}

function listed(items: readonly string[]): string {
  if (items.length < 2) return items.join('');
  return `${items.slice(0, -1).join(', ')} and ${items[items.length - 1]}`;
}
