import type { Package } from '../config/package.js';
import { COMMANDS, type CommandName } from './commands.js';
import type { Findings, Violation } from './findings.js';
import { RULE_NAMES, RULES, type RuleName } from './rule-names.js';

/** What an audit found. A plain object, written as it stands for JSON; times are DRAM clocks and may end in .5. */
export interface AuditReport {
  readonly format: 'penstock-audit';
  readonly version: 1;
  readonly ok: boolean; // no violation
  readonly partial: boolean; // the log was not read to its end
  readonly package: { readonly name: string; readonly file: string; readonly hash: string };
  readonly start_ck: number; // first command; 0 where there is none
  readonly end_ck: number; // end of the log
  readonly span_ps: number; // from one to the other
  readonly commands: number;
  readonly commands_by_name: Readonly<Record<CommandName, number>>;
  readonly violations: number; // one a command and rule it breaks
  readonly rules: readonly AuditedRule[]; // all rules
  readonly kept: readonly Violation[]; // in full: the first hundred, and the first of each rule
}

export interface AuditedRule {
  readonly rule: RuleName;
  readonly meaning: string;
  readonly checked: boolean; // false: this package has nothing it could be broken by
  readonly violations: number;
}

/** What the checker counted: commands in all and by number, first and last clock (first Infinity where there was none). */
export interface Counted {
  readonly commands: number;
  readonly byCommand: Float64Array;
  readonly startCk: number;
  readonly endCk: number;
}

export function makeReport(
  pkg: Package,
  { commands, byCommand, startCk, endCk }: Counted,
  findings: Findings,
): AuditReport {
  const violations = findings.counts.reduce((sum, count) => sum + count, 0);
  const start = Math.min(startCk, endCk);
  return {
    format: 'penstock-audit',
    version: 1,
    ok: violations === 0,
    partial: false,
    package: { name: pkg.name, file: pkg.file, hash: pkg.hash },
    start_ck: start,
    end_ck: endCk,
    span_ps: (endCk - start) * pkg.memory[0].clockPs,
    commands,
    commands_by_name: Object.fromEntries(COMMANDS.map((name, i) => [name, byCommand[i]])) as Record<
      CommandName,
      number
    >,
    violations,
    rules: RULE_NAMES.map((rule, i) => ({
      rule,
      meaning: RULES[rule],
      checked: isChecked(rule, pkg),
      violations: findings.counts[i],
    })),
    kept: findings.kept.slice(),
  };
}

/** Can the package break the rule at all? A device has either two command buses or one, and refresh may be off. */
function isChecked(rule: RuleName, { memory: [{ buses, refresh }] }: Package): boolean {
  if (rule === 'row bus' || rule === 'column bus') return buses.separate;
  if (rule === 'command bus') return !buses.separate;
  if (rule === 'refresh gap' || rule === 'refresh owed' || rule === 'refresh ahead') return refresh.mode !== 'off';
  return true;
}
