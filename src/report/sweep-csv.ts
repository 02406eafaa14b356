import type { SweepTable } from './sweep-table.js';

type Cell = string | number | boolean | null;

/** Columns of the runs table, as CSV and Parquet have them. */
export interface SweepColumn {
  readonly name: string;
  readonly type: 'INT32' | 'DOUBLE' | 'STRING';
  readonly values: readonly (string | number | null)[];
}

/** One row a run: what it was, what became of it, and every figure in the base unit its name ends in. */
export function sweepColumns({ parameters, figures, runs }: SweepTable): SweepColumn[] {
  const text = (name: string, values: (string | null)[]): SweepColumn => ({ name, type: 'STRING', values });
  return [
    { name: 'point', type: 'INT32', values: runs.map(({ point }) => point) },
    { name: 'configuration', type: 'INT32', values: runs.map(({ configuration }) => configuration) },
    ...parameters.map((name, i): SweepColumn => {
      const values = runs.map((run) => run.parameters[i]);
      if (values.every((value) => typeof value === 'number')) return { name, type: 'DOUBLE', values };
      return text(name, values.map(String));
    }),
    text(
      'seed',
      runs.map(({ seed }) => seed),
    ),
    text(
      'error',
      runs.map(({ error }) => error),
    ),
    text(
      'binds',
      runs.map(({ binds }) => binds),
    ),
    ...figures.map(({ name }, i): SweepColumn => ({ name, type: 'DOUBLE', values: runs.map((run) => run.figures[i]) })),
  ];
}

/** The runs as CSV (RFC 4180, lines end in a line feed). */
export function sweepRunsCsv(table: SweepTable): string {
  const columns = sweepColumns(table);
  return csv(
    columns.map(({ name }) => name),
    table.runs.map((_, row) => columns.map(({ values }) => values[row])),
  );
}

/** The configurations as CSV: means over the repeats, each with the half width of its 95 % confidence interval beside it. */
export function sweepConfigurationsCsv(table: SweepTable): string {
  const { parameters, figures, configurations } = table;
  const head = ['configuration', ...parameters, 'runs', 'failed', 'binds', 'front', 'cost', 'meets'];
  return csv(
    [...head, ...figures.flatMap(({ name }) => [name, `${name}.half_width`])],
    configurations.map((one) => [
      one.index,
      ...one.parameters,
      one.runs,
      one.failed,
      one.binds,
      one.front,
      one.cost,
      one.meets,
      ...one.figures.flatMap((figure) => [figure?.mean ?? null, figure?.half ?? null]),
    ]),
  );
}

function csv(head: readonly string[], rows: readonly (readonly Cell[])[]): string {
  return `${[head, ...rows].map((row) => row.map(cell).join(',')).join('\n')}\n`;
}

function cell(value: Cell): string {
  if (value === null) return '';
  if (typeof value !== 'string') return String(value);
  return /[",\r\n]/.test(value) ? `"${value.replaceAll('"', '""')}"` : value;
}
