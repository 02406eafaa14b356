import type { Option } from './echarts.js';
import type { Ink } from './theme.js';

const FONT = 'system-ui, -apple-system, "Segoe UI", Roboto, "Noto Sans", Arial, sans-serif';

/** A chart of the page: its option from the data and the colours of the moment, and how high it must be. */
export interface Plot {
  option(ink: Ink, width: number): Option;
  height?(width: number): number; // px; the style sheet's otherwise
}

/** What all charts share. */
export function base(ink: Ink): Record<string, unknown> {
  return {
    animation: false,
    textStyle: { fontFamily: FONT, color: ink.ink, fontSize: 12 },
    backgroundColor: 'transparent',
  };
}

export function axis(ink: Ink, more: Record<string, unknown> = {}): Record<string, unknown> {
  return {
    axisLine: { show: true, lineStyle: { color: ink.rule } },
    axisTick: { lineStyle: { color: ink.rule } },
    splitLine: { lineStyle: { color: ink.rule, opacity: 0.6 } },
    axisLabel: { color: ink.soft, fontSize: 12, hideOverlap: true },
    nameTextStyle: { color: ink.soft, fontSize: 12 },
    ...more,
  };
}

export function tooltip(ink: Ink, formatter: (params: never) => HTMLElement): Record<string, unknown> {
  return {
    confine: true,
    backgroundColor: ink.sheet,
    borderColor: ink.rule,
    textStyle: { color: ink.ink, fontFamily: FONT },
    formatter,
  };
}

/** The inside of a tooltip: built from nodes, so that names are text whatever they hold. */
export function tip(title: string, rows: readonly (readonly [name: string, value: string])[]): HTMLElement {
  const box = document.createElement('div');
  box.className = 'tip';
  const head = document.createElement('b');
  head.textContent = title;
  box.append(head);
  for (const [name, value] of rows) {
    const row = document.createElement('div');
    const [left, right] = [document.createElement('span'), document.createElement('span')];
    left.textContent = name;
    right.textContent = value;
    row.append(left, right);
    box.append(row);
  }
  return box;
}

/** A name no longer than `most` letters. */
export function brief(name: string, most: number): string {
  const letters = [...name];
  return letters.length <= most ? name : `${letters.slice(0, most - 1).join('')}…`;
}
