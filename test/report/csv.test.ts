import { describe, expect, test } from 'vitest';
import { buildResult, type Result } from '../../src/analysis/index.js';
import { STACK_CLASSES, STAGES } from '../../src/engine/recording.js';
import { csvTable, TABLE_NAMES, type TableName, tableHead } from '../../src/report/index.js';
import { made } from '../analysis/recording.js';

const ORIGIN = {
  version: '9.9.9',
  options: { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY },
  overrides: [],
} as const;

function sample(): Result {
  const { pkg, trace, recording, delays } = made();
  return buildResult(pkg, trace, ORIGIN, recording, delays);
}

type Columns = Record<string, string> &
  Partial<
    Record<
      | 'kernel'
      | 'attained_bytes_per_s'
      | 'bound_flops_per_s'
      | 'of'
      | 'op'
      | 'stage'
      | 'mean_ps'
      | 'atoms'
      | 'from_ps'
      | 'to_ps',
      string
    >
  >;

/** Rows of a table as objects by column. */
function rows(result: Result, name: TableName): Columns[] {
  const [head, ...lines] = csvTable(result, name).trimEnd().split('\n');
  const columns = head.split(',');
  return lines.map((line) => {
    const cells = line.split(',');
    expect(cells).toHaveLength(columns.length);
    return Object.fromEntries(columns.map((column, i) => [column, cells[i]])) as Columns;
  });
}

const sum = (of: readonly Record<string, unknown>[], column: string): number =>
  of.reduce((total, row) => total + Number(row[column]), 0);

describe('tables as CSV', () => {
  test.each(TABLE_NAMES)('%s: every row has every column, and the head tells the tables apart', (name) => {
    expect(rows(sample(), name).length).toBeGreaterThan(0);
    expect(TABLE_NAMES.filter((other) => tableHead(other) === tableHead(name))).toEqual([name]);
  });

  test('kernels have the figures of the document in full', () => {
    const result = sample();
    const table = rows(result, 'kernels.csv');
    expect(table.map((row) => row.kernel)).toEqual(['gather', 'product']);
    expect(table.map((row) => Number(row.attained_bytes_per_s))).toEqual(
      result.kernels.map((kernel) => kernel.attained_bytes_per_s),
    );
    expect(table[0].bound_flops_per_s).toBe(''); // no flops, no figure
    // all that is one value a kernel has a column
    const { name: _, bandwidth_stack: __, ...rest } = result.kernels[0];
    expect(Object.keys(rest).sort()).toEqual(
      Object.keys(table[0])
        .filter((key) => key !== 'kernel')
        .sort(),
    );
  });

  test('the stacks add up to the run’s', () => {
    const result = sample();
    const table = rows(result, 'bandwidth-stack.csv');
    const stacks = table.filter((row) => row.of === 'stack');
    for (const name of STACK_CLASSES) {
      expect(sum(stacks, `${name}_ck`), name).toBe(result.bandwidth_stack[name]);
      expect(Number(table[0][`${name}_ck`]), name).toBe(result.bandwidth_stack[name]);
    }
  });

  test('delays: the means of a read’s stages add up to its latency', () => {
    const table = rows(sample(), 'delays.csv');
    const reads = table.filter((row) => row.op === 'read');
    expect(reads.map((row) => row.stage)).toEqual([...STAGES, 'total']);
    expect(sum(reads.slice(0, -1), 'mean_ps')).toBeCloseTo(Number(reads[8].mean_ps), 6);
  });

  test('banks stand in the order of their counters, and atoms are the bytes moved', () => {
    const result = sample();
    const table = rows(result, 'banks.csv');
    expect(table.map((row) => Number(row.atoms))).toEqual(result.banks.atoms);
    expect(new Set(table.map((row) => Object.values(row).slice(0, 6).join())).size).toBe(table.length);
    expect(sum(table, 'atoms') * result.package.memory[0].organisation.atom_bytes).toBe(result.bandwidth.moved_bytes);
  });

  test('time goes forward without gaps to the end of the run, and the bytes are all there', () => {
    const result = sample();
    for (const name of ['timeline.csv', 'stack-timeline.csv'] as const) {
      const table = rows(result, name);
      expect(table.slice(1).map((row) => row.from_ps)).toEqual(table.slice(0, -1).map((row) => row.to_ps));
      expect(Number(table.at(-1)?.to_ps)).toBe(result.makespan_ps);
    }
    const table = rows(result, 'timeline.csv');
    expect(sum(table, 'read_bytes') + sum(table, 'write_bytes')).toBe(result.bandwidth.moved_bytes);
  });

  test('names with commas, quotes and line ends are quoted', () => {
    const result = sample();
    const [kernel] = result.kernels;
    const named = { ...result, kernels: [{ ...kernel, name: 'a,"b"\nc' }] };
    expect(csvTable(named, 'kernels.csv').split('\n').slice(1, 3).join('\n')).toMatch(/^"a,""b""\nc",die,1,2,/);
  });
});
