import { inkNow } from './theme.js';

/** Keys of the series that are not shown. */
export type Hidden = Set<string>;

interface Entry {
  readonly key: string;
  readonly label: string;
  readonly colour: () => string;
}

/** Fills a legend with a button a series, pressed while it is shown. Colours are set again by the function returned. */
export function makeLegend(name: string, entries: readonly Entry[], hidden: Hidden, changed: () => void): () => void {
  const box = document.querySelector(`[data-legend="${name}"]`);
  if (box === null) return () => {};
  const swatches = entries.map(({ key, label, colour }) => {
    const button = document.createElement('button');
    button.type = 'button';
    button.setAttribute('aria-pressed', 'true');
    const swatch = document.createElementNS('http://www.w3.org/2000/svg', 'svg');
    swatch.setAttribute('viewBox', '0 0 10 10');
    swatch.setAttribute('aria-hidden', 'true');
    const square = document.createElementNS('http://www.w3.org/2000/svg', 'rect');
    square.setAttribute('width', '10');
    square.setAttribute('height', '10');
    swatch.append(square);
    button.append(swatch, label);
    button.addEventListener('click', () => {
      if (!hidden.delete(key)) hidden.add(key);
      button.setAttribute('aria-pressed', String(!hidden.has(key)));
      changed();
    });
    box.append(button);
    return () => square.setAttribute('fill', colour());
  });
  return () => {
    for (const paint of swatches) paint();
  };
}

/** The colour of a class or stage by its key, as it is now. */
export function colourOf(key: string): () => string {
  return () => inkNow().of(key);
}
