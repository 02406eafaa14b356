import fc from 'fast-check';
import { expect, it } from 'vitest';
import { domains } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import { AddressMap } from '../../src/model/address-map.js';
import { accessTrace, kernelTrace, type Row, simulate, sum } from '../helpers/engine.js';
import { anyDesign, anyReplay, anyWork, build, finished, PLAIN, rowsOf } from './cases.js';

/** Atoms each pseudo-channel is asked for, [read, write] by p, found by decoding the address of every atom of every row. */
function atomsAsked(pkg: Package, rows: readonly Row[]): [number[], number[]] {
  const map = new AddressMap(pkg, domains(pkg));
  const { organisation: o } = pkg.memory[0];
  const total = o.stacks * o.channels * o.pseudo_channels;
  const asked: [number[], number[]] = [new Array(total).fill(0), new Array(total).fill(0)];
  for (const { op, address, bytes } of rows) {
    for (let a = address - (address % o.atom_bytes); a < address + bytes; a += o.atom_bytes) {
      map.decode(map.domainOf(a), a);
      asked[op === 'R' ? 0 : 1][map.p]++;
    }
  }
  return asked;
}

it('every byte asked for is answered, and every atom crosses the right data bus or is served from a write queue', async () => {
  let forwardings = 0;
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, anyReplay, async (design, work, replay) => {
      const pkg = build(design);
      const rows = rowsOf(pkg, work);
      const { all, collector } = finished();
      const { recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
        replay,
        collectors: [collector],
      });
      const atom = pkg.memory[0].organisation.atom_bytes;

      // bytes, by kernel and direction
      for (const k of [0, 1]) {
        const asked = (op: 'R' | 'W'): number =>
          sum(rows.filter((r) => r.kernel === k && r.op === op).map((r) => r.bytes));
        expect(recording.kernels[k].readBytes).toBe(asked('R'));
        expect(recording.kernels[k].writeBytes).toBe(asked('W'));
        expect(sum(all.filter((r) => r.kernel === k).map((r) => r.bytes))).toBe(asked('R') + asked('W'));
        expect(recording.kernels[k].requests).toBe(all.filter((r) => r.kernel === k).length);
        if (work.tiles)
          expect(recording.kernels.reduce((n, kernel) => n + kernel.flops, 0)).toBe(sum(rows.map((r) => r.flops ?? 0)));
      }

      // atoms, by pseudo-channel and direction
      const [reads, writes] = atomsAsked(pkg, rows);
      expect([...recording.dram.writes]).toEqual(writes);
      reads.forEach((asked, p) => {
        const served = all.filter((r) => r.op === 2 && r.p === p);
        forwardings += served.length;
        expect(recording.dram.forwarded[p]).toBe(served.length);
        const missing = asked - recording.dram.reads[p];
        if (work.size > 0) {
          // rows of whole atoms: exactly the atoms of the requests served from the write queue
          expect(missing).toBe(sum(served.map((r) => r.bytes)) / atom);
        } else {
          expect(missing).toBeGreaterThanOrEqual(sum(served.map((r) => Math.ceil(r.bytes / atom))));
          expect(missing).toBeLessThanOrEqual(sum(served.map((r) => Math.ceil(r.bytes / atom) + 1)));
        }
      });

      // moved bytes of the kernels and of the time line are those of the buses
      const moved = atom * sum(recording.dram.reads);
      expect(sum(recording.kernels.map((k) => k.movedReadBytes))).toBe(moved);
      expect(sum(recording.timeline.readBytes)).toBe(moved);
      expect(sum(recording.kernels.map((k) => k.movedWriteBytes))).toBe(atom * sum(writes));
      expect(sum(recording.timeline.writeBytes)).toBe(atom * sum(writes));
    }),
    { seed: 1, numRuns: 60 },
  );
  expect(forwardings).toBeGreaterThan(0); // or the cases say nothing about them
});

it('requests are what the links carried: headers, data and acknowledgements', async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, async (design, work) => {
      const pkg = build(design);
      // one request a row, eight atoms each
      const rows = rowsOf(pkg, { ...work, size: 256 }).map((r) => ({ ...r, address: r.address - (r.address % 256) }));
      const map = new AddressMap(pkg, domains(pkg));
      const { recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']));
      const { organisation: o } = pkg.memory[0];
      pkg.links.forEach((link, stack) => {
        const here = rows.filter(({ address }) => {
          map.decode(map.domainOf(address), address);
          return Math.floor(map.p / (o.channels * o.pseudo_channels)) === stack;
        });
        const r = here.filter((row) => row.op === 'R').length;
        const w = here.length - r;
        expect(recording.links[stack].payloadBytesDown).toBe((r + w) * link.requestHeaderBytes + 256 * w);
        expect(recording.links[stack].payloadBytesUp).toBe(r * (link.responseHeaderBytes + 256) + w * link.ackBytes);
        // a flit carries at least one byte and at most its payload
        const most = link.flitBytes - link.flitOverheadBytes;
        expect(recording.links[stack].flitsDown * most).toBeGreaterThanOrEqual(recording.links[stack].payloadBytesDown);
        expect(recording.links[stack].flitsUp * most).toBeGreaterThanOrEqual(recording.links[stack].payloadBytesUp);
      });
    }),
    { seed: 2, numRuns: 25 },
  );
});

it('kernels move the bytes and do the flops of their launches', async () => {
  const pkg = build({ ...PLAIN, stacks: 2, eastStacks: 1 });
  const rows = [
    ['gather', 'main', '', 0, 48 * 1024, 24 * 1024, 'uniform granule=64B span=1MiB', 'sequential', 2],
    ['product', 'main', 'bf16', 3e6, 96 * 1024, 32 * 1024, 'block rows=16 width=256B pitch=4KiB', 'sequential', 1],
    ['strides', 'side', '', 0, 64 * 1024, 0, 'strided stride=2KiB granule=512B', '', 3],
    [
      'skewed',
      'side',
      '',
      0,
      32 * 1024,
      64 * 1024,
      'zipf s=1.1 granule=128B span=1MiB',
      'strided stride=8KiB granule=64B',
      1,
    ],
    ['list', 'third', '', 0, 4096, 0, 'chase granule=64B span=1MiB', '', 1],
  ] as const;
  const text = [
    'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat',
    ...rows.map(([name, s, format, flops, read, write, rp, wp, repeat]) =>
      [
        name,
        s,
        format,
        flops > 0 ? `${flops / 1e6} MFLOP` : 0,
        `${read} B`,
        `${write} B`,
        rp,
        wp,
        '8 KiB',
        repeat,
      ].join(','),
    ),
  ].join('\n');
  const trace = await kernelTrace(pkg, text);
  const { all, collector } = finished();
  const { recording } = await simulate(pkg, trace, { collectors: [collector] });
  rows.forEach(([, , , flops, read, write, , , repeat], k) => {
    const got = recording.kernels[k];
    expect([got.readBytes, got.writeBytes, got.launches]).toEqual([read * repeat, write * repeat, repeat]);
    expect(got.flops).toBeCloseTo(flops * repeat, 3);
    expect(sum(all.filter((r) => r.kernel === k).map((r) => r.bytes))).toBe((read + write) * repeat);
    // whole atoms: at least the useful bytes, but for what write queues served
    const forwarded = sum(all.filter((r) => r.kernel === k && r.op === 2).map((r) => r.bytes));
    expect(got.movedReadBytes).toBeGreaterThanOrEqual(read * repeat - forwarded);
    expect(got.movedWriteBytes).toBeGreaterThanOrEqual(write * repeat);
  });
});
