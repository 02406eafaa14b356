import { describe, expect, it } from 'vitest';
import { accessTrace, placer, simulate } from '../helpers/engine.js';
import { lonePackage } from '../helpers/packages.js';

describe('one read', () => {
  it('is an ACT and an RD tRCD later', async () => {
    const pkg = lonePackage();
    const at = placer(pkg);
    const { commands } = await simulate(pkg, accessTrace([{ op: 'R', address: at({ row: 5, bank: 2 }), bytes: 32 }]), { log: true });
    expect(commands.map((c) => c.command)).toEqual(['ACT', 'RD']);
    expect(commands[1].ck - commands[0].ck).toBe(26); // 16 ns / 0.625 ns, rounded up to clocks
    expect(commands[0]).toMatchObject({ row: 5, bank: 2, sid: 0, bankGroup: 0 });
  });
});
