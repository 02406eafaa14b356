import type { Result } from '../analysis/result-schema.js';

const WIDTH = 120;

/** The result document as JSON text: what fits on a line stands on one, and equal results give equal bytes. */
export function jsonReport(result: Result): string {
  return `${prettyJson(result)}\n`;
}

/** JSON with two blanks of indentation, objects and arrays on one line where they fit. */
export function prettyJson(value: unknown, indent = '', used = 0): string {
  const flat = JSON.stringify(value);
  if (typeof value !== 'object' || value === null || indent.length + used + flat.length <= WIDTH) return flat;
  const inner = `${indent}  `;
  if (Array.isArray(value)) {
    if (value.every((item) => typeof item === 'number')) return `[\n${wrapped(value, inner)}\n${indent}]`;
    return `[\n${value.map((item) => inner + prettyJson(item, inner)).join(',\n')}\n${indent}]`;
  }
  const entries = Object.entries(value).filter(([, item]) => item !== undefined);
  const lines = entries.map(([key, item]) => {
    const name = `${JSON.stringify(key)}: `;
    return inner + name + prettyJson(item, inner, name.length);
  });
  return `{\n${lines.join(',\n')}\n${indent}}`;
}

/** Long columns of numbers, as many to a line as fit. */
function wrapped(values: readonly number[], indent: string): string {
  const lines: string[] = [];
  let line = '';
  for (const value of values) {
    const text = JSON.stringify(value);
    if (line !== '' && indent.length + line.length + text.length + 2 > WIDTH) {
      lines.push(line);
      line = '';
    }
    line += line === '' ? text : `, ${text}`;
  }
  return lines
    .concat(line)
    .map((text) => indent + text)
    .join(',\n');
}
