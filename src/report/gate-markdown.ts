import { gateCause, gateCells, gateSentence, sorted } from './gate.js';
import type { GateComparison, GateRow, GateTable } from './gate-table.js';
import { plain } from './style.js';

/** The gate as Markdown (CommonMark with tables) for the text of a pull request: the verdict, what moved, the rest folded away. */
export function gateMarkdown(gate: GateTable): string {
  return `${gate.comparisons.map((comparison) => section(gate, comparison)).join('\n\n')}\n`;
}

function section(gate: GateTable, comparison: GateComparison): string {
  const { rows, differences, causes } = comparison;
  const moved = sorted(rows.filter(({ verdict }) => verdict !== 'same'));
  const same = rows.filter(({ verdict }) => verdict === 'same');
  const parts = [`### ${escaped(gateSentence(gate, comparison))}`];
  if (differences.length > 0) parts.push(differences.map((line) => `- ${escaped(line)}`).join('\n'));
  if (moved.length > 0) parts.push(rowsTable(moved));
  if (causes.length > 0) {
    parts.push(`Where the time went:\n\n${causes.map((cause) => `- ${escaped(gateCause(cause))}`).join('\n')}`);
  }
  if (same.length > 0) {
    parts.push(`<details>\n<summary>${same.length} figures the same</summary>\n\n${rowsTable(same)}\n\n</details>`);
  }
  return parts.join('\n\n');
}

function rowsTable(rows: readonly GateRow[]): string {
  const lines = rows.map((row) => [
    row.verdict === 'worse' || row.verdict === 'missing' ? `**${row.verdict}**` : row.verdict,
    row.kernel === null ? 'run' : escaped(row.kernel),
    escaped(row.figure),
    ...gateCells(row).map(escaped),
  ]);
  const head = ['verdict', 'kernel', 'figure', 'baseline', 'now', 'change', 'allowed'];
  const rule = ['---', '---', '---', '---:', '---:', '---:', '---:'];
  return [head, rule, ...lines].map((cells) => `| ${cells.join(' | ')} |`).join('\n');
}

/** Names from files and traces stay text: no markup, no HTML, no cell or line of their own. */
function escaped(text: string): string {
  return plain(text)
    .replaceAll(/[&<@]/g, (letter) => ENTITIES[letter])
    .replaceAll(/[\\`*_{}[\]()#+!|~>]/g, '\\$&');
}

// an @ would call someone in most places where Markdown is shown
const ENTITIES: Readonly<Record<string, string>> = { '&': '&amp;', '<': '&lt;', '@': '&commat;' };
