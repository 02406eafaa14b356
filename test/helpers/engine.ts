import { domains } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import {
  COMMANDS,
  type Collector,
  type CommandName,
  geometryOf,
  type Recording,
  type RunOptions,
  run,
  type SampleBlock,
  STAGES,
} from '../../src/engine/index.js';
import { AddressMap } from '../../src/model/address-map.js';
import {
  type AccessBatch,
  type AccessTrace,
  type KernelTrace,
  READ,
  type Trace,
  WRITE,
} from '../../src/trace/batch.js';
import { openTrace } from '../../src/trace/index.js';

export interface Row {
  readonly op: 'R' | 'W';
  readonly address: number;
  readonly bytes: number;
  readonly timePs?: number;
  readonly engine?: number;
  readonly after?: number;
  readonly tile?: number;
  readonly flops?: number;
  readonly kernel?: number; // index into the kernel names
  readonly die?: number;
}

/** An access trace from rows in memory; a generator is read lazily. Columns are there when the first row has them. */
export function accessTrace(rows: Iterable<Row>, kernel: string | string[] = 'test'): AccessTrace {
  const iterator = rows[Symbol.iterator]();
  let next = iterator.next();
  const has = (key: keyof Row): boolean => !next.done && next.value[key] !== undefined;
  const column = (key: keyof Row): Int32Array<ArrayBuffer> | null => (has(key) ? new Int32Array(SIZE) : null);
  const SIZE = 1024;
  const batch: AccessBatch = {
    count: 0,
    op: new Uint8Array(SIZE),
    address: new Float64Array(SIZE),
    bytes: new Float64Array(SIZE),
    timePs: has('timePs') ? new Float64Array(SIZE) : null,
    die: column('die'),
    engine: column('engine'),
    kernel: new Int32Array(SIZE),
    tile: column('tile'),
    flops: has('flops') ? new Float64Array(SIZE) : null,
    after: column('after'),
  };
  return {
    kind: 'access',
    file: 'memory.csv',
    kernelNames: [kernel].flat(),
    hasTime: has('timePs'),
    facts: () => ({ rows: 0, skippedRows: 0, hash: '' }),
    async *batches() {
      while (!next.done) {
        batch.count = 0;
        while (!next.done && batch.count < SIZE) {
          const row = next.value;
          const i = batch.count++;
          batch.op[i] = row.op === 'R' ? READ : WRITE;
          batch.address[i] = row.address;
          batch.bytes[i] = row.bytes;
          if (batch.timePs) batch.timePs[i] = row.timePs ?? 0;
          batch.kernel[i] = row.kernel ?? 0;
          if (batch.die) batch.die[i] = row.die ?? -1;
          if (batch.engine) batch.engine[i] = row.engine ?? -1;
          if (batch.tile) batch.tile[i] = row.tile ?? -1;
          if (batch.flops) batch.flops[i] = row.flops ?? 0;
          if (batch.after) batch.after[i] = row.after ?? 0;
          next = iterator.next();
        }
        yield batch;
      }
    },
  };
}

/** A kernel trace from CSV text. */
export async function kernelTrace(pkg: Package, text: string): Promise<KernelTrace> {
  async function* bytes(): AsyncGenerator<Buffer> {
    yield Buffer.from(text);
  }
  const trace = await openTrace('-', {
    input: bytes(),
    dieNames: pkg.dies.map((die) => die.name),
    geometry: geometryOf(pkg, domains(pkg)),
  });
  if (trace.kind !== 'kernel') throw new Error('not a kernel trace');
  return trace;
}

export interface LoggedCommand {
  readonly ck: number;
  readonly p: number;
  readonly sid: number;
  readonly bankGroup: number;
  readonly bank: number;
  readonly row: number;
  readonly column: number;
  readonly command: CommandName;
  readonly request: number;
}

/** One finished request: its stage delays by name, ps. */
export type Sample = Record<(typeof STAGES)[number], number> & {
  readonly op: number;
  readonly bytes: number;
  readonly donePs: number;
};

export interface Outcome {
  readonly recording: Recording;
  readonly commands: LoggedCommand[]; // empty unless asked for
  readonly samples: Sample[]; // empty unless asked for
}

export interface Wishes extends Partial<RunOptions> {
  readonly log?: boolean;
  readonly keepSamples?: boolean;
  readonly collectors?: Collector[];
}

/** Runs the engine with defaults for everything that is not wished for, and throws when one of its own checks fails. */
export async function simulate(pkg: Package, trace: Trace, wishes: Wishes = {}): Promise<Outcome> {
  const commands: LoggedCommand[] = [];
  const samples: Sample[] = [];
  const keep: Collector = {
    add(block: SampleBlock) {
      for (let i = 0; i < block.count; i++) {
        const stages = Object.fromEntries(STAGES.map((name, s) => [name, block.stages[s][i]]));
        samples.push({ ...stages, op: block.op[i], bytes: block.bytes[i], donePs: block.donePs[i] } as Sample);
      }
    },
  };
  const recording = await run(
    pkg,
    trace,
    {
      replay: 'closed',
      seed: '1',
      untilPs: Number.POSITIVE_INFINITY,
      windowPs: Number.POSITIVE_INFINITY,
      attribution: true,
      onCommand: wishes.log
        ? (halfCk, p, sid, bankGroup, bank, row, column, command, request) =>
            commands.push({ ck: halfCk / 2, p, sid, bankGroup, bank, row, column, command: COMMANDS[command], request })
        : null,
      onProgress: null,
      signal: null,
      ...wishes,
    },
    [...(wishes.keepSamples ? [keep] : []), ...(wishes.collectors ?? [])],
  );
  const failed = recording.checks.filter((check) => !check.ok);
  if (failed.length > 0) throw new Error(`checks failed: ${JSON.stringify(failed)}`);
  return { recording, commands, samples };
}

/** Addresses of places in a package's first die, for traces that aim at banks and rows. */
export function placer(
  pkg: Package,
): (place: { p?: number; sid?: number; bankGroup?: number; bank?: number; row?: number; column?: number }) => number {
  const map = new AddressMap(pkg, domains(pkg));
  const { organisation: o } = pkg.memory[0];
  return ({ p = 0, sid = 0, bankGroup = 0, bank = 0, row = 0, column = 0 }) =>
    map.encode(0, p, (sid * o.bank_groups + bankGroup) * o.banks_per_group + bank, row, column);
}

export const sum = (values: Iterable<number>): number => {
  let total = 0;
  for (const value of values) total += value;
  return total;
};
