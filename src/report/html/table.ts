import { html, type Markup, type Piece } from './markup.js';

export interface Column {
  readonly head: string;
  readonly text?: true; // to the left; numbers stand to the right
  readonly title?: string; // what it means, when the head is short for it
}

/** A cell: what is shown, and the number it is sorted by where that is not plain from the text. */
export type Cell = Piece | { readonly show: Piece; readonly by: number | null };

/** A number as shown, and as it is sorted. */
export function cell(show: Piece, by: number | null): Cell {
  return { show, by };
}

interface Options {
  readonly sortable?: boolean; // the heads become buttons
  readonly id?: string;
}

/** A table with a caption; the first cell of a row is its head. Wide ones scroll inside a region the keyboard reaches. */
export function table(
  caption: string,
  columns: readonly Column[],
  rows: readonly (readonly Cell[])[],
  { sortable = false, id }: Options = {},
): Markup {
  const heads = columns.map(({ head, text, title }) => {
    const name = sortable ? html`<button type="button">${head}<span aria-hidden="true"></span></button>` : head;
    return html`<th scope="col"${text ? html` class="t"` : ''}${title === undefined ? '' : html` title="${title}"`}>${name}</th>`;
  });
  const body = rows.map((row) => {
    const cells = row.map((given, i) => {
      const { show, by } = isSorted(given) ? given : { show: given, by: undefined };
      const value = by === undefined || !sortable ? '' : html` data-by="${by === null ? '' : by}"`;
      if (i === 0) return html`<th scope="row"${value}>${show}</th>`;
      return html`<td${columns[i].text ? html` class="t"` : ''}${value}>${show}</td>`;
    });
    return html`<tr>${cells}</tr>`;
  });
  return html`<div class="scroll" tabindex="0" role="region" aria-label="${caption}"><table${id === undefined ? '' : html` id="${id}"`}${sortable ? html` class="sortable"` : ''}><caption>${caption}</caption><thead><tr>${heads}</tr></thead><tbody>${body}</tbody></table></div>`;
}

function isSorted(given: Cell): given is { readonly show: Piece; readonly by: number | null } {
  return typeof given === 'object' && given !== null && 'show' in given;
}

/** A table that opens on demand, below a chart of the same figures. */
export function folded(summary: string, body: Markup): Markup {
  return html`<details><summary>${summary}</summary>${body}</details>`;
}

/** Facts as pairs of name and value. */
export function pairs(entries: readonly (readonly [string, Piece])[]): Markup {
  return html`<dl class="pairs">${entries.map(([name, value]) => html`<div><dt>${name}</dt><dd>${value}</dd></div>`)}</dl>`;
}
