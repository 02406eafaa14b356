import { formatTime } from '../units.js';
import { COMMANDS } from './commands.js';
import type { Violation } from './findings.js';
import type { AuditReport } from './report.js';
import type { LoggedCommand } from './shape.js';

const WIDTH = 100; // columns

const count = (value: number): string => value.toLocaleString('en-US');
const plural = (value: number, word: string): string => `${count(value)} ${word}${value === 1 ? '' : 's'}`;

/** The report for people: lines of at most 100 columns. `most`: how many violations to show in full, of those kept. */
export function auditLines(report: AuditReport, most = 10): string[] {
  const { commands, violations, start_ck, end_ck, span_ps } = report;
  const log = `${plural(commands, 'command')} from ck ${start_ck} to ck ${end_ck} (${formatTime(span_ps)})`;
  if (report.ok) {
    const checked = report.rules.filter((rule) => rule.checked);
    return [`${log}: none breaks any of ${checked.length} rules.`, ...countLines(report)];
  }
  const broken = report.rules.filter((rule) => rule.violations > 0);
  const lines = [
    `${plural(violations, 'violation')} of ${plural(broken.length, 'rule')} in ${log}.`,
    ...countLines(report),
    '',
    ...broken.map((rule) => `${count(rule.violations).padStart(13)}  ${rule.rule.padEnd(14)} ${rule.meaning}`),
    '',
  ];
  const shown = chosen(report.kept, most);
  for (const violation of shown) lines.push(...violationLines(violation));
  if (violations > shown.length) lines.push(`... and ${count(violations - shown.length)} more.`);
  return lines;
}

/** How many there were of each command, on as many lines as it takes. */
function countLines({ commands_by_name: counts }: AuditReport): string[] {
  const lines: string[] = [];
  let line = '';
  for (const name of COMMANDS) {
    if (counts[name] === 0) continue;
    const item = `${count(counts[name])} ${name}`;
    if (line !== '' && line.length + item.length + 3 > WIDTH) {
      lines.push(`${line},`);
      line = '';
    }
    line += line === '' ? item : `, ${item}`;
  }
  return line === '' ? lines : [...lines, `${line}.`];
}

/** `most` of the violations in the order of the log: the first of each rule before any second one. */
function chosen(kept: readonly Violation[], most: number): readonly Violation[] {
  const seen = new Set<string>();
  const firsts = kept.filter(({ rule }) => !seen.has(rule) && seen.add(rule));
  const others = kept.filter((violation) => !firsts.includes(violation));
  const wanted = new Set([...firsts, ...others].slice(0, most));
  return kept.filter((violation) => wanted.has(violation));
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
