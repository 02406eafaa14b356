import { afterAll, describe, expect, it } from 'vitest';
import { COMMANDS as AUDITED, auditLines, createAudit } from '../../src/audit/index.js';
import type { Package } from '../../src/config/package.js';
import { COMMANDS } from '../../src/engine/index.js';
import { accessTrace, simulate } from '../helpers/engine.js';
import { build, type Design, PATTERNS, PLAIN, REFRESHES, rowsOf } from './cases.js';

/*
 * The audit, a second reading of the timing rules, over what the engine does: every pattern x page policy x refresh mode x mix of
 * reads and writes x device. `npm test` takes a slice of several million commands, `npm run soak` runs thirteen times as long.
 */
const { MODE } = (import.meta as unknown as { env: { MODE: string } }).env;
const SOAK = MODE === 'soak';
const ROWS = SOAK ? 4_000 : 300;
const MIXES = [0, 0.5, 1]; // share of writes
let commands = 0;

it('names the commands as the engine does', () => {
  expect(AUDITED).toEqual(COMMANDS);
});

/** Runs rows through a package and audits every command on its way; throws with what was found. */
async function audited(pkg: Package, rows: Parameters<typeof accessTrace>[0]): Promise<number> {
  const { organisation: o } = pkg.memory[0];
  const audit = createAudit(pkg);
  const { recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
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

const DEVICES = ['hbm3-6.4', 'hbm2-1.8'] as const;
describe.each(DEVICES)('%s', (device) => {
  describe.each(['open', 'closed', 'timeout'] as const)('%s page', (page) => {
    it.each(REFRESHES)(
      'refresh %s',
      async (refresh) => {
        const design: Design = { ...PLAIN, device, page, refresh, queue: 32, window: 64, fold: true };
        for (const pattern of PATTERNS) {
          for (const writes of MIXES) {
            const pkg = build(design);
            const work = { pattern, rows: ROWS, writes, size: 0, gapPs: 0, after: false, tiles: false, seed: 11 };
            commands += await audited(pkg, rowsOf(pkg, work));
          }
        }
      },
      600_000,
    );
  });
});

describe('other corners', () => {
  const corners: Partial<Design>[] = [
    { scheduler: 'fcfs' },
    { queue: 2, window: 6 },
    { stacks: 2, eastStacks: 1, channels: 3, clocks: ['1.3 GHz', '2.1 GHz'] },
    { fold: false },
  ];
  it.each(corners)(
    '%j',
    async (corner) => {
      for (const refresh of REFRESHES) {
        for (const pattern of ['uniform', 'strided', 'block'] as const) {
          const pkg = build({ ...PLAIN, queue: 32, window: 64, refresh, ...corner });
          const work = { pattern, rows: ROWS, writes: 0.3, size: 64, gapPs: 0, after: false, tiles: false, seed: 5 };
          commands += await audited(pkg, rowsOf(pkg, work));
        }
      }
    },
    600_000,
  );
});

afterAll(() => {
  console.log(`audited ${commands.toLocaleString('en-US')} commands, none broke a rule`);
  expect(commands).toBeGreaterThan(SOAK ? 50_000_000 : 3_000_000);
});
