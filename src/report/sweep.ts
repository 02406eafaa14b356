import { showQuantity } from './quantity.js';
import { type Ink, ink, plain, type TextStyle, table, wrap } from './style.js';
import type { SweepConfiguration, SweepEffect, SweepTable } from './sweep-table.js';

const MOST_ROWS = 24; // of the table: the rest is in the files
const MOST_LABEL = 22; // columns of one parameter
const USUAL = ['bandwidth.achieved_bytes_per_s', 'bandwidth.bound_ratio', 'makespan_ps', 'read_latency.p99_ps'];

/** A sweep in a terminal: the answer first, then the front or the best, what each axis does, and what failed. */
export function sweepReport(sweep: SweepTable, style: TextStyle): string {
  const paint = ink(style);
  const parts = [
    heading(sweep, paint),
    answer(sweep, paint),
    rows(sweep, paint),
    effects(sweep, paint),
    failures(sweep, paint),
  ];
  return `${parts.filter((part) => part !== '').join('\n')}\n`;
}

function heading(sweep: SweepTable, { chalk, width }: Ink): string {
  const { runs, points, configurations, program } = sweep;
  const done = runs.filter(({ error }) => error === null).length;
  const failed = runs.length - done;
  const counts = [
    runs.length < points ? `${done} of ${points} runs done` : `${done} runs`,
    `${configurations.length} configurations`,
    ...(failed > 0 ? [`${failed} failed`] : []),
  ];
  return chalk.dim(wrap(`penstock ${program} · ${plain(sweep.name)} · ${counts.join(' · ')}`, width));
}

function answer(sweep: SweepTable, { chalk, width }: Ink): string {
  const { cheapest, needs, cost, configurations, goals } = sweep;
  if (cheapest !== null) {
    const asked = needs.map((need) => plain(need)).join(' and ');
    const best = cheapest.map((index) => at(configurations, index));
    if (best.length === 0) {
      const near = configurations.filter(({ failed }) => failed === 0).length;
      return chalk.bold(wrap(`No package of the ${near} configurations that ran reaches ${asked}.`, width));
    }
    const price = Math.max(...best.map((one) => one.cost ?? Number.NaN));
    return chalk.bold(
      wrap(
        `The cheapest package that reaches ${asked}: ${packageName(sweep, best[0])}, at a cost (${plain(cost ?? '')}) of ${number(price)}.`,
        width,
      ),
    );
  }
  if (goals.length === 0) return '';
  const count = configurations.filter(({ front }) => front).length;
  const words = goals.map(({ figure, better }) => `${figure} ${better}`).join(', ');
  return chalk.bold(
    wrap(`Pareto front (${words}): ${count} of ${configurations.length} configurations, marked *.`, width),
  );
}

/** What a package is called by: those of its parameters that vary, the trace aside. */
function packageName(sweep: SweepTable, one: SweepConfiguration): string {
  const words = sweep.parameters.flatMap((name, i) =>
    name !== 'trace' && sweep.varying.includes(name) ? [`${plain(name)} ${plain(String(one.parameters[i]))}`] : [],
  );
  return words.length > 0 ? words.join(', ') : plain(String(one.parameters[0]));
}

const at = (configurations: readonly SweepConfiguration[], index: number): SweepConfiguration =>
  configurations.find((one) => one.index === index) as SweepConfiguration;

/** Which figures the table shows: the goals and what the needs name, else the usual ones. */
function shown(sweep: SweepTable): number[] {
  const named = [...sweep.goals.map(({ figure }) => figure), ...sweep.figures.map(({ name }) => name)].filter(
    (name) =>
      [...sweep.needs, sweep.cost ?? ''].some((text) => text.includes(name)) ||
      sweep.goals.some(({ figure }) => figure === name),
  );
  const names = [...new Set([...named, ...(named.length < 3 ? USUAL : [])])].slice(0, 5);
  return names.map((name) => sweep.figures.findIndex((figure) => figure.name === name)).filter((i) => i >= 0);
}

function rows(sweep: SweepTable, { chalk }: Ink): string {
  const figures = shown(sweep);
  const parameters = sweep.varying.map((name) => sweep.parameters.indexOf(name));
  const priced = sweep.cost !== null;
  const sorted = [...sweep.configurations].filter(({ failed, runs }) => failed < runs).sort(order(sweep, figures));
  if (sorted.length === 0) return '';
  const head = [
    '',
    ...parameters.map((i) => plain(sweep.parameters[i], MOST_LABEL)),
    ...(priced ? ['cost'] : []),
    ...figures.map((i) => shortName(sweep.figures[i].name)),
    'binds',
  ];
  const lines = sorted
    .slice(0, MOST_ROWS)
    .map((one) => [
      `${one.front ? '*' : ' '}${sweep.cheapest?.includes(one.index) ? '>' : ' '}`,
      ...parameters.map((i) => plain(String(one.parameters[i]), MOST_LABEL)),
      ...(priced ? [one.cost === null ? '-' : number(one.cost)] : []),
      ...figures.map((i) => figureText(sweep, one, i)),
      one.binds.replaceAll('_', ' '),
    ]);
  const left = [...parameters.map((_, i) => i + 1), head.length - 1];
  const [first, ...rest] = table(head, lines, left).split('\n');
  const more = sorted.length - lines.length;
  const note = more > 0 ? `\n${chalk.dim(`  and ${more} more, in the files`)}` : '';
  return `\n${chalk.dim(first)}\n${rest.join('\n')}${note}\n`;
}

/** The front first, then by cost where there is one, then by the first figure shown, better ones first. */
function order(sweep: SweepTable, figures: readonly number[]) {
  const [figure] = figures;
  const goal = sweep.goals.find((one) => one.figure === sweep.figures[figure]?.name);
  const sign = goal?.better === 'down' || (goal === undefined && sweep.figures[figure]?.kind === 'time') ? 1 : -1;
  const value = (one: SweepConfiguration): number =>
    sign * (one.figures[figure]?.mean ?? Number.NEGATIVE_INFINITY * sign);
  const chosen = (one: SweepConfiguration): number => (sweep.cheapest?.includes(one.index) ? 0 : 1);
  return (a: SweepConfiguration, b: SweepConfiguration): number =>
    chosen(a) - chosen(b) || Number(b.front) - Number(a.front) || value(a) - value(b) || a.index - b.index;
}

function figureText(sweep: SweepTable, one: SweepConfiguration, i: number): string {
  const { kind, share } = sweep.figures[i];
  const figure = one.figures[i];
  if (figure === null) return '-';
  const text = showQuantity(figure.mean, kind, share);
  if (figure.half === null || figure.mean === 0) return text;
  return `${text} ±${number((100 * figure.half) / Math.abs(figure.mean))} %`;
}

/** A figure's name without its unit, which the value has: 'achieved bandwidth' rather than the path. */
function shortName(name: string): string {
  const words = name.replace(/_(bytes|flops)_per_s$|_ps$|_ratio$/, '').split('.');
  return plain(words.slice(-2).join(' ').replaceAll('_', ' '), 24);
}

function effects({ effects: all, figures }: SweepTable, { chalk, width }: Ink): string {
  if (all.length === 0) return '';
  const figure = figures.find(({ name }) => name === all[0].figure);
  const show = (value: number): string => showQuantity(value, figure?.kind ?? 'number', figure?.share);
  const lines = all.map((effect) => {
    const low = least(effect, -1);
    const high = least(effect, 1);
    const slope = effect.elasticity === null ? '' : `, ${number(effect.elasticity)} % for each per cent`;
    const text = `${plain(effect.axis)}: ${number(100 * effect.swing)} % (${plain(low.label, MOST_LABEL)}: ${show(low.mean)}, ${plain(high.label, MOST_LABEL)}: ${show(high.mean)}${slope})`;
    return `  ${wrap(text, width - 2, '    ')}`;
  });
  return `${chalk.bold(`What each axis does to ${all[0].figure}`)}\n${lines.join('\n')}\n`;
}

function least({ levels }: SweepEffect, sign: 1 | -1): SweepEffect['levels'][number] {
  return levels.reduce((best, level) => (sign * level.mean > sign * best.mean ? level : best));
}

const MOST_FAILURES = 5;

function failures(sweep: SweepTable, { chalk, width }: Ink): string {
  const failed = sweep.runs.filter(({ error }) => error !== null);
  if (failed.length === 0) return '';
  const messages = new Map<string, number[]>();
  for (const { error, point } of failed) {
    const text = plain(error ?? '');
    messages.set(text, [...(messages.get(text) ?? []), point]);
  }
  const lines = [...messages].slice(0, MOST_FAILURES).map(([text, points]) => {
    const which = `${points.slice(0, 6).join(', ')}${points.length > 6 ? ` and ${points.length - 6} more` : ''}`;
    return `  ${wrap(`point ${which}: ${text}`, width - 2, '    ')}`;
  });
  const more =
    messages.size > MOST_FAILURES ? [`  and ${messages.size - MOST_FAILURES} other reasons, in the files`] : [];
  return [chalk.yellow.bold(`${failed.length} of ${sweep.runs.length} runs failed`), ...lines, ...more].join('\n');
}

/** Three significant digits. */
function number(value: number): string {
  return Number.isFinite(value) ? String(Number(value.toPrecision(3))) : '-';
}
