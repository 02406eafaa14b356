import type { Result } from '../analysis/result-schema.js';
import { CAUTION } from './caution.js';
import { bandwidthSection, stackSection } from './sections/bandwidth.js';
import { computeSection, kernelSection } from './sections/kernels.js';
import { latencySection } from './sections/latency.js';
import { facts, type Ink, ink, plain, type TextStyle, wrap } from './style.js';

/** The report an engineer reads in a terminal: what binds first, then what was achieved, where the rest went, who waited. */
export function textReport(result: Result, style: TextStyle): string {
  const paint = ink(style);
  const sections = [
    heading(result, paint),
    bandwidthSection(result, paint),
    stackSection(result, paint),
    latencySection(result, paint),
    computeSection(result, paint),
    kernelSection(result, paint),
    closing(result, paint),
  ];
  return `${sections.join('\n')}\n`;
}

function heading({ provenance, package: pkg, verdict }: Result, { chalk, width }: Ink): string {
  const { options, seed, trace_file, skipped_rows, package_file, version } = provenance;
  const line = facts(
    [
      `penstock ${version}`,
      `${plain(pkg.name)} (${plain(package_file)})`,
      plain(trace_file),
      ...(skipped_rows > 0 ? [`${skipped_rows} bad rows skipped`] : []),
      `${options.replay} loop`.replace('paced loop', 'paced'),
      `seed ${plain(seed, 24)}`,
      ...options.overrides.map((override) => plain(override)),
    ],
    width,
    '',
  );
  return `${chalk.dim(line)}\n${chalk.bold(wrap(verdict.sentence, width))}`;
}

function closing({ checks, partial, package: pkg }: Result, { chalk, width }: Ink): string {
  const failed = checks.filter((check) => !check.ok);
  const lines: string[] = [];
  if (failed.length === 0) {
    lines.push(`${chalk.bold('Checks')} ${chalk.green(`${checks.length} of ${checks.length} passed`)}`);
  } else {
    lines.push(chalk.red.bold(`Checks: ${failed.length} of ${checks.length} FAILED; this result must not be used`));
    for (const { name, got, expected } of failed) lines.push(chalk.red(`  ${name}: ${got}, expected ${expected}`));
  }
  if (partial)
    lines.push(
      chalk.yellow('Partial: the run was stopped before the trace ended; requests under way are not counted.'),
    );
  const caution = pkg.caution === '' ? CAUTION : `${CAUTION} ${plain(pkg.caution)}`;
  return [...lines, chalk.dim(wrap(caution, width))].join('\n');
}
