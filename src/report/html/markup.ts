import { plain } from '../style.js';

/** Text that is markup already and goes into the page as it stands. */
export class Markup {
  constructor(readonly text: string) {}
}

/** What may stand between pieces of markup: text is escaped, markup is not, nothing is left out. */
export type Piece = string | number | Markup | null | false | readonly Piece[];

/**
 * Markup from a template. Every value that is not Markup itself is escaped, for text and for quoted attributes alike, so names
 * from files and traces stay text wherever they stand; control and direction characters in them become `?`.
 */
export function html(parts: TemplateStringsArray, ...values: readonly Piece[]): Markup {
  let text = parts[0];
  values.forEach((value, i) => {
    text += rendered(value) + parts[i + 1];
  });
  return new Markup(text);
}

function rendered(value: Piece): string {
  if (value === null || value === false) return '';
  if (value instanceof Markup) return value.text;
  if (typeof value === 'object') return value.map(rendered).join('');
  return escaped(plain(String(value)));
}

const ENTITIES: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&#39;',
};

export function escaped(text: string): string {
  return text.replaceAll(/[&<>"']/g, (letter) => ENTITIES[letter]);
}

/** A document as JSON for a script element: no `<` can end the element or open a comment. */
export function scriptJson(value: unknown): Markup {
  return new Markup(JSON.stringify(value).replaceAll('<', '\\u003c'));
}
