/** Colours as the style sheet has them at the moment: light, dark, or paper. */
export interface Ink {
  readonly ink: string;
  readonly soft: string;
  readonly rule: string;
  readonly sheet: string;
  readonly accent: string;
  readonly room: string;
  readonly attained: string;
  readonly estimate: string;
  readonly heat: readonly string[]; // from nothing to most
  of(name: string): string; // a class of the stack or a stage
}

export function inkNow(): Ink {
  const style = getComputedStyle(document.documentElement);
  const value = (name: string): string => style.getPropertyValue(`--${name}`).trim();
  return {
    ink: value('ink'),
    soft: value('soft'),
    rule: value('rule'),
    sheet: value('sheet'),
    accent: value('accent'),
    room: value('room'),
    attained: value('attained'),
    estimate: value('estimate'),
    heat: ['room', 'heat-1', 'heat-2', 'heat-3'].map(value),
    of: (name) => value(`c-${name}`),
  };
}

/** Calls `changed` when the colours change: by the choice on the page, by the system's, and around printing. */
export function onTheme(changed: (printing: boolean) => void): void {
  const choice = document.querySelector<HTMLSelectElement>('[data-theme-choice]');
  choice?.addEventListener('change', () => {
    if (choice.value === 'auto') delete document.documentElement.dataset.theme;
    else document.documentElement.dataset.theme = choice.value;
    changed(false);
  });
  matchMedia('(prefers-color-scheme: dark)').addEventListener('change', () => changed(false));
  matchMedia('print').addEventListener('change', ({ matches }) => changed(matches));
}
