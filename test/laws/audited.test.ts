import { afterAll, describe, expect, it } from 'vitest';
import { COMMANDS as AUDITED } from '../../src/audit/index.js';
import { COMMANDS } from '../../src/engine/index.js';
import { audited, SOAK } from './audited.js';
import { build, type Design, PATTERNS, PLAIN, REFRESHES, rowsOf } from './cases.js';

/*
 * The audit, a second reading of the timing rules, over what the engine does: every pattern x page policy x refresh mode x mix of
 * reads and writes x device. `npm test` takes a slice of several million commands, `npm run soak` runs thirteen times as long.
 */
const ROWS = SOAK ? 4_000 : 300;
const MIXES = [0, 0.5, 1]; // share of writes
let commands = 0;

it('names the commands as the engine does', () => {
  expect(AUDITED).toEqual(COMMANDS);
});

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
  const corners: [Partial<Design>, ...string[]][] = [
    [{ scheduler: 'fcfs' }],
    [{ queue: 2, window: 6 }],
    [{ stacks: 2, eastStacks: 1, channels: 3, clocks: ['1.3 GHz', '2.1 GHz'] }],
    [{ fold: false }],
    [{}, 'memory.0.refresh.temperature=95 C'], // tREFI halved
    [{}, 'memory.0.refresh.postpone=8'],
    [{}, 'memory.0.activate_window_scope=sid'],
    [{ page: 'closed' }, 'memory.0.command_buses.separate=false'],
    [{ device: 'hbm2-1.8' }, 'memory.0.command_buses.separate=false'],
  ];
  it.each(corners)(
    '%j %s',
    async (corner, ...overrides) => {
      for (const refresh of REFRESHES) {
        for (const pattern of ['uniform', 'strided', 'block'] as const) {
          const pkg = build({ ...PLAIN, queue: 32, window: 64, refresh, ...corner }, ...overrides);
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
