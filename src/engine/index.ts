/**
 * engine: what happens, in order.
 *
 * In: a Package and a Trace. Out: a Recording, and blocks of finished requests handed to collectors on the way.
 * Its one decision: windows. The compute dies and the channels take turns, each going as far as the other cannot reach it, so
 * channels run long stretches alone (run.ts is the loop; front-end.ts the dies and links; channel.ts controllers and DRAM).
 * Not modelled here: what figures mean (analysis), rules in nanoseconds (config), routes over several links.
 */
import type { Package } from '../config/package.js';
import type { Trace } from '../trace/batch.js';
import type { Collector, Recording, RunOptions } from './recording.js';
import { runEngine } from './run.js';

let last: Promise<unknown> = Promise.resolve();

/**
 * Runs a trace through a package. The engine's state belongs to its module, so runs in one thread follow each other; for runs
 * side by side give each a worker thread.
 */
export function run(pkg: Package, trace: Trace, options: RunOptions, collectors: Collector[]): Promise<Recording> {
  const result = last.then(() => runEngine(pkg, trace, options, collectors));
  last = result.catch(() => undefined);
  return result;
}

export { geometryOf } from './make-work.js';
export * from './recording.js';
