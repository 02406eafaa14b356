/** The files of a sweep that is done: made of its points in their order, so that equal sweeps give equal bytes. */
import { join } from 'node:path';
import { type SweepTable, sweepConfigurationsCsv, sweepParquet, sweepRunsCsv } from '../report/index.js';
import { OutputFile } from './output.js';

/** Writes the tables into the folder, all or none. Returns their names. */
export async function writeTables(folder: string, table: SweepTable): Promise<string[]> {
  const files = [
    ['runs.csv', 'sweepRuns', () => sweepRunsCsv(table)],
    ['configurations.csv', 'sweepConfigurations', () => sweepConfigurationsCsv(table)],
    ['runs.parquet', 'parquet', () => sweepParquet(table)],
  ] as const;
  const open = files.map(([name, kind, make]) => [new OutputFile(join(folder, name), kind), make] as const);
  for (const [file, make] of open) file.write(await make());
  for (const [file] of open) file.commit();
  return files.map(([name]) => name);
}
