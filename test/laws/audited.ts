import { auditLines, createAudit } from '../../src/audit/index.js';
import type { Package } from '../../src/config/package.js';
import { accessTrace, type Row, simulate, type Wishes } from '../helpers/engine.js';

const { MODE } = (import.meta as unknown as { env: { MODE: string } }).env;
/** True under `npm run soak`, which runs the same tests at greater length. */
export const SOAK = MODE === 'soak';

/** Runs rows through a package and audits every command on its way; throws with what was found. Returns how many there were. */
export async function audited(pkg: Package, rows: readonly Row[], wishes: Wishes = {}): Promise<number> {
  const { organisation: o } = pkg.memory[0];
  const audit = createAudit(pkg);
  const { recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
    ...wishes,
    onCommand: (halfCk, p, sid, bankGroup, bank, row, column, command, request) => {
      const channel = Math.floor(p / o.pseudo_channels);
      audit.command(
        halfCk,
        Math.floor(channel / o.channels),
        channel % o.channels,
        p % o.pseudo_channels,
        sid,
        bankGroup,
        bank,
        row,
        column,
        command,
        request,
      );
    },
  });
  const report = audit.finish(2 * recording.elapsedCk);
  if (!report.ok) throw new Error(auditLines(report, 3).join('\n'));
  return report.commands;
}
