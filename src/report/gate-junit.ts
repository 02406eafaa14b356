import { gateCause, gateCells, gateSentence } from './gate.js';
import { fails, type GateComparison, type GateRow, type GateTable } from './gate-table.js';

/**
 * The gate as JUnit XML for a CI server: a suite a candidate, a case a figure, a failure where one is worse or missing. It holds no
 * times, since nothing is run here and equal results give equal files.
 */
export function gateJunit(gate: GateTable): string {
  const suites = gate.comparisons.map((comparison) => suite(gate, comparison));
  const rows = gate.comparisons.flatMap((comparison) => comparison.rows);
  const failed = rows.filter(({ verdict }) => fails(verdict)).length;
  return [
    '<?xml version="1.0" encoding="UTF-8"?>',
    `<testsuites name="penstock gate" tests="${rows.length}" failures="${failed}" errors="0" time="0">`,
    ...suites,
    '</testsuites>',
    '',
  ].join('\n');
}

function suite(gate: GateTable, comparison: GateComparison): string {
  const { candidate, rows, differences } = comparison;
  const failed = rows.filter(({ verdict }) => fails(verdict)).length;
  const notes = [gateSentence(gate, comparison), ...differences, ...comparison.causes.map(gateCause)].join('\n');
  return [
    `  <testsuite name="${xml(candidate)}" tests="${rows.length}" failures="${failed}" errors="0" skipped="0" time="0">`,
    ...rows.map((row) => testcase(comparison, row)),
    `    <system-out>${xml(notes)}</system-out>`,
    '  </testsuite>',
  ].join('\n');
}

function testcase({ causes }: GateComparison, row: GateRow): string {
  const { kernel, figure, verdict } = row;
  const open = `    <testcase classname="${xml(kernel === null ? 'run' : `kernel.${kernel}`)}" name="${xml(figure)}" time="0"`;
  if (!fails(verdict)) return `${open}/>`;
  const [baseline, candidate, change, allowed] = gateCells(row);
  const text =
    verdict === 'missing'
      ? `${figure} is missing: the baseline has it, the candidate does not`
      : `${figure} is worse: ${baseline} -> ${candidate}${change === '' ? '' : ` (${change}, allowed ${allowed})`}`;
  const cause = causes.find((one) => one.kernel === kernel && one.verdict === 'worse');
  return [
    `${open}>`,
    `      <failure type="${verdict}" message="${xml(text)}">${xml(cause === undefined ? text : gateCause(cause))}</failure>`,
    '    </testcase>',
  ].join('\n');
}

const ENTITIES: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&apos;',
};

/** Text for XML 1.0: escaped, and without the characters it has no place for. */
function xml(text: string): string {
  return text
    .replaceAll(/[^\t\n\r\u{20}-\u{D7FF}\u{E000}-\u{FFFD}\u{10000}-\u{10FFFF}]/gu, '?')
    .replaceAll(/[&<>"']/g, (letter) => ENTITIES[letter]);
}
