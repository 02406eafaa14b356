import { COMMANDS, type CommandName } from './commands.js';
import type { Findings, Violation } from './findings.js';
import { RULE_NAMES, RULES, type RuleName } from './rule-names.js';
import type { LoggedCommand } from './shape.js';

/** What an audit found. A plain object, written as it stands for JSON; times are DRAM clocks and may end in .5. */
export interface AuditReport {
  readonly format: 'penstock-audit';
  readonly version: 1;
  readonly ok: boolean; // no violation
  readonly end_ck: number; // end of the log
  readonly commands: number;
  readonly commands_by_name: Readonly<Record<CommandName, number>>;
  readonly violations: number; // one a command and rule it breaks
  readonly rules: readonly { readonly rule: RuleName; readonly meaning: string; readonly violations: number }[]; // all rules
  readonly kept: readonly Violation[]; // in full: the first hundred, and the first of each rule
}

export function makeReport(commands: number, byCommand: Float64Array, endCk: number, findings: Findings): AuditReport {
  const violations = findings.counts.reduce((sum, count) => sum + count, 0);
  return {
    format: 'penstock-audit',
    version: 1,
    ok: violations === 0,
    end_ck: endCk,
    commands,
    commands_by_name: Object.fromEntries(COMMANDS.map((name, i) => [name, byCommand[i]])) as Record<
      CommandName,
      number
    >,
    violations,
    rules: RULE_NAMES.map((rule, i) => ({ rule, meaning: RULES[rule], violations: findings.counts[i] })),
    kept: findings.kept.slice(),
  };
}

const count = (value: number): string => value.toLocaleString('en-US');
const plural = (value: number, word: string): string => `${count(value)} ${word}${value === 1 ? '' : 's'}`;

/** The report for people: lines of at most 100 columns. `most`: how many violations to show in full. */
export function auditLines(report: AuditReport, most = 10): string[] {
  const { commands, violations, kept } = report;
  if (report.ok)
    return [`${plural(commands, 'command')} up to ck ${report.end_ck}: no rule broken (${RULE_NAMES.length} rules).`];
  const broken = report.rules.filter((rule) => rule.violations > 0);
  const lines = [
    `${plural(violations, 'violation')} of ${plural(broken.length, 'rule')} in ${plural(commands, 'command')} up to ck ${report.end_ck}.`,
    '',
    ...broken.map((rule) => `${count(rule.violations).padStart(13)}  ${rule.rule.padEnd(14)} ${rule.meaning}`),
    '',
  ];
  for (const violation of kept.slice(0, most)) lines.push(...violationLines(violation));
  if (violations > most) lines.push(`... and ${count(violations - Math.min(most, kept.length))} more.`);
  return lines;
}

/** What came, what it broke, and what it is counted from. */
function violationLines({ rule, command, earlier, bound, required_ck, found_ck, note }: Violation): string[] {
  const lines = command === null ? ['at the end of the log'] : fitted('', command);
  const since = earlier === null ? ' since the start of the log' : '';
  if (bound === null) lines.push(`    ${rule}: ${note}`);
  else
    lines.push(`    ${rule}: ${bound} ${required_ck} ck, found ${found_ck}${since}${note === '' ? '' : ` (${note})`}`);
  if (earlier !== null) lines.push(...fitted('    after ', earlier));
  return lines;
}

const WIDTH = 100;

/** A command on one line, or with its place on a second one where it would not fit. */
function fitted(lead: string, c: LoggedCommand): string[] {
  const when = `${lead}line ${c.line}: ck ${c.ck} ${c.command}`;
  const where = placeWords(c);
  const whole = `${when} ${where}`;
  return whole.length <= WIDTH ? [whole] : [when, `${' '.repeat(lead.length + 4)}${where}`];
}

function placeWords(c: LoggedCommand): string {
  const places = [
    `stack ${c.stack}`,
    `channel ${c.channel}.${c.pseudo_channel}`,
    c.sid === null ? '' : `sid ${c.sid}`,
    c.bank_group === null ? '' : `bank ${c.bank_group}.${c.bank ?? '?'}`,
    c.row === null ? '' : `row ${c.row}`,
    c.column === null ? '' : `column ${c.column}`,
  ];
  return places.filter((place) => place !== '').join(' ');
}
