import { html, type Markup, type Piece } from '../markup.js';

interface Figure {
  readonly id: string;
  readonly title: string;
  readonly reading: Piece; // one or two sentences: what is to be seen
  readonly chart?: { readonly key: string; readonly label: string; readonly size?: string }; // drawn by the page's program
  readonly controls?: Piece; // above the chart
  readonly body?: Piece; // what stands in place of a chart, or below it
}

/** A section of the page: heading, what is to be seen, the chart, and below it the same figures as a table. */
export function section({ id, title, reading, chart, controls, body }: Figure): Markup {
  const plot =
    chart === undefined
      ? ''
      : html`<div class="plot ${chart.size ?? 'mid'}" data-chart="${chart.key}" role="img" aria-label="${chart.label}"></div>`;
  return html`<section id="${id}" aria-labelledby="${id}-h"><h2 id="${id}-h">${title}</h2><p class="reading">${together(reading)}</p>${controls ?? ''}${plot}${body ?? ''}</section>
`;
}

/** Text in which no line breaks between a number and its unit. */
export function together(text: Piece): Piece {
  if (typeof text === 'string')
    return text.replaceAll(/(\d) (?=(?:%|[pnum]?s|[kMGTP]?(?:B|FLOP)\/s|[KMGT]?i?B)(?![\w]))/g, '$1\u00a0');
  return Array.isArray(text) ? text.map(together) : text;
}

/** Room for a chart's legend; the page's program fills it with a button a series. */
export function legend(chart: string, what: string): Markup {
  return html`<div class="legend" data-legend="${chart}" role="group" aria-label="${what}"></div>`;
}
