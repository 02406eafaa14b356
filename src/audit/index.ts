/**
 * audit: the second, independent reading of the DRAM timing rules.
 *
 * In: the commands of a log and the device values of a Package. Out: an AuditReport of every rule broken, by which commands.
 * Its one decision: it shares no code with the engine, so that an error of reading in one does not hide in the other. Every
 * least time between two commands is a row of one table (separations.ts); the rest stands in buses.ts and refresh.ts.
 * Not modelled: how many activations refresh management (RFM) is due after; power-down and self-refresh; a log that does not
 * begin at clock 0 with all banks closed.
 */
export { COMMANDS, type CommandName } from './commands.js';
export type { Violation } from './findings.js';
export { auditLines } from './lines.js';
export { createLogReader, type LogReader, type LogSink } from './read-log.js';
export type { AuditedRule, AuditReport } from './report.js';
export { RULE_NAMES, RULES, type RuleName } from './rule-names.js';
export { type Audit, createAudit } from './rules.js';
export type { LoggedCommand } from './shape.js';
