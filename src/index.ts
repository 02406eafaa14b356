/**
 * penstock as a library: load a package, open a trace, simulate. Nothing here prints or ends the process; what is wrong is
 * thrown as InputError (the package, the trace or an option), CheckError (the program's own fault) or SystemError.
 *
 *     const pkg = loadPackage('configs/wagtail.yaml');
 *     const trace = await openTrace('traces/wagtail-step.csv', { package: pkg });
 *     const result = await simulate(pkg, trace);
 *
 * Runs in one thread follow each other; for runs side by side give each a worker thread.
 */
import { readFileSync } from 'node:fs';
import { buildResult, Delays, type Result } from './analysis/index.js';
import { domains, type Package } from './config/index.js';
import { geometryOf, type RunOptions, run } from './engine/index.js';
import { openTrace as openAnyTrace, type Trace, type TraceOptions } from './trace/index.js';

export type { Result } from './analysis/index.js';
export { resultJsonSchema } from './analysis/index.js';
export type { Package } from './config/index.js';
export { describePackage, loadPackage, packageJsonSchema, parsePackage } from './config/index.js';
export type { CommandSink, Progress } from './engine/index.js';
export { COMMANDS, STACK_CLASSES, STAGES } from './engine/index.js';
export { CheckError, InputError, SystemError } from './errors.js';
export type {
  AccessBatch,
  AccessTrace,
  Kernel,
  KernelTrace,
  SynthOptions,
  Trace,
  TraceOptions,
} from './trace/index.js';
export { accessCsv, synthesise } from './trace/index.js';

/** Version of the program, as results carry it. */
export const VERSION: string = JSON.parse(readFileSync(new URL('../package.json', import.meta.url), 'utf8')).version;

/**
 * Opens a trace file (`.csv`, `.csv.gz`). With `package` its rows are checked against that package's dies and capacity; without,
 * only for form. A trace can be simulated once: it is read as it is used.
 */
export function openTrace(file: string, options: TraceOptions & { readonly package?: Package } = {}): Promise<Trace> {
  const { package: pkg, ...others } = options;
  if (pkg === undefined) return openAnyTrace(file, others);
  const dieNames = pkg.dies.map((die) => die.name);
  return openAnyTrace(file, { dieNames, geometry: geometryOf(pkg, domains(pkg)), ...others });
}

export interface SimulateOptions
  extends Partial<Pick<RunOptions, 'replay' | 'seed' | 'untilPs' | 'onCommand' | 'onProgress' | 'signal'>> {
  /** The overrides the package was loaded with: the result says them again. */
  readonly overrides?: readonly string[];
}

/**
 * Simulates `trace` on `pkg`. By default in closed loop, with seed '1', to the end of the trace. The result is the document that
 * `penstock run --json` writes; look at its `checks` before you use it, and at `partial` when the run could have been cut short.
 */
export async function simulate(pkg: Package, trace: Trace, options: SimulateOptions = {}): Promise<Result> {
  const full = runOptions(options);
  const delays = new Delays();
  const recording = await run(pkg, trace, full, [delays]);
  return buildResult(
    pkg,
    trace,
    { version: VERSION, options: full, overrides: options.overrides ?? [] },
    recording,
    delays,
  );
}

/** The engine's options, with every default filled in. */
function runOptions({ overrides: _, ...given }: SimulateOptions): RunOptions {
  return {
    replay: 'closed',
    seed: '1',
    untilPs: Number.POSITIVE_INFINITY,
    windowPs: Number.POSITIVE_INFINITY, // as long as the package allows: the result does not depend on it
    attribution: true,
    onCommand: null,
    onProgress: null,
    signal: null,
    ...given,
  };
}
