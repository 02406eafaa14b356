/**
 * report: a result in words, tables and text formats.
 *
 * In: a Result (or a package's Description). Out: a string; the command line decides where it goes.
 * Its one decision: a reporter is a pure function of the document and a style, so what is printed can always be had again.
 * Not modelled: nothing is computed here but ratios of two figures of the document.
 */
export { csvTable, TABLE_NAMES, type TableName, tableHead } from './csv.js';
export { descriptionReport } from './describe.js';
export { gateReport } from './gate.js';
export { gateJunit } from './gate-junit.js';
export { gateMarkdown } from './gate-markdown.js';
export {
  fails,
  type GateCause,
  type GateComparison,
  type GateRow,
  type GateTable,
  type GateVerdict,
} from './gate-table.js';
export { htmlReport } from './html/index.js';
export { jsonReport, prettyJson } from './json.js';
export { profileReport } from './profile.js';
export { rooflineReport } from './roofline.js';
export { ink, plain, type TextStyle, table, wrap } from './style.js';
export { sweepReport } from './sweep.js';
export { sweepConfigurationsCsv, sweepRunsCsv } from './sweep-csv.js';
export { sweepParquet } from './sweep-parquet.js';
export type { SweepConfiguration, SweepEffect, SweepRun, SweepTable } from './sweep-table.js';
export { textReport } from './text.js';
export { type WhatIfFigures, type WhatIfSource, whatIfReport } from './whatif.js';
