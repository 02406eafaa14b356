import { type Recording, STACK_CLASSES, type StackClass } from '../engine/recording.js';
import type { BandwidthStack, Result } from './result-schema.js';
import { sum } from './sums.js';

const CLASSES = STACK_CLASSES.length;

/** Values by class, in the classes' order. */
function byClass<V>(value: (name: StackClass, c: number) => V): Record<StackClass, V> {
  return Object.fromEntries(STACK_CLASSES.map((name, c) => [name, value(name, c)])) as Record<StackClass, V>;
}

/** Rows `from` … `to - 1` of a table of CLASSES columns added up, ck by class, and their total. */
export function stackOfRows(table: Float64Array, from: number, to: number): BandwidthStack {
  const classes = byClass((_, c) => {
    let ck = 0;
    for (let at = from * CLASSES + c; at < Math.min(to * CLASSES, table.length); at += CLASSES) ck += table[at];
    return ck;
  });
  return { ...classes, total: sum(Object.values(classes)) };
}

/** The bandwidth stack over time, a column a class. */
export function stackTimeline({ stackTimeline: { sliceCk, slicePs, classes } }: Recording): Result['stack_timeline'] {
  const slices = classes.length / CLASSES;
  return {
    slice_ps: slicePs,
    slice_ck: sliceCk,
    classes: byClass((_, c) => Array.from({ length: slices }, (_, i) => classes[i * CLASSES + c])),
  };
}

/** What a read waited for in its controller's queue on the average, ps by class; zeros without reads. */
export function queueWait({ readWaitCk }: Recording, clockPs: number, reads: number): Result['queue_wait'] {
  const mean = (ck: number): number => (reads > 0 ? (ck * clockPs) / reads : 0);
  const parts = Object.fromEntries(STACK_CLASSES.map((name, c) => [`${name}_ps`, mean(readWaitCk[c])]));
  return { ...parts, total_ps: mean(sum(readWaitCk)) } as Result['queue_wait'];
}
