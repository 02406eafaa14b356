// The DRAM channels alone, without compute dies or links: 32 pseudo-channels of one stack, their read queues kept full.
import { domains, loadPackage } from '../../dist/config/index.js';
import { channelCounters, resetChannels, runChannels, sendToChannel } from '../../dist/engine/channel.js';
import { resetCredits, takeEdge, takePair } from '../../dist/engine/credits.js';
import { drainEgress, resetEgress } from '../../dist/engine/egress.js';
import { FLAGS, makeRequests, PLACE, RECORD_INTS } from '../../dist/engine/request-records.js';
import { resetTraffic } from '../../dist/engine/traffic.js';
import { separationsOf } from '../../dist/model/separations.js';
import { systemOf } from '../../dist/model/system.js';

const PACKAGE = new URL('../../configs/wagtail.yaml', import.meta.url).pathname;
const WINDOW = 58; // half clocks: the demo package's round trip
const DELAY_PS = 9000; // a freed slot is filled again after this long

export function bareChannel(pattern, requests) {
  const pkg = loadPackage(PACKAGE, [
    'memory.0.stacks=1',
    'links.0.to=hbm.0',
    'links=[{ name: l, from: west, to: hbm.0, lanes: 512, rate: 16 GT/s }]',
    'compute=[{ name: west, clock: 1.6 GHz, engines: 1 }]',
  ]);
  const [memory] = pkg.memory;
  const system = systemOf(pkg);
  const total = system.total;
  const halfPs = memory.clockPs / 2;
  domains(pkg);
  resetChannels(system, separationsOf(memory), memory, { attribution: true, onCommand: null });
  resetTraffic();
  resetCredits([memory.clockPs], new Int32Array(total), new Float64Array(total).fill(DELAY_PS), halfPs, 60_000);
  const records = makeRequests(total * 256);
  resetEgress(records, 1, total, 400);
  const free = Array.from({ length: total * 256 }, (_, i) => i);
  const leave = (handle) => free.push(handle);
  const credits = new Int32Array(total).fill(memory.controller.readQueue);
  const position = new Int32Array(total);
  let state = 12345;
  const random = () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state;
  };
  let sent = 0;
  const feed = (p, at) => {
    for (; credits[p] > 0 && sent < requests; credits[p]--, sent++) {
      let bank = random() >>> 27;
      let row = random() >>> 18;
      let column = random() >>> 27;
      if (pattern === 'sequential') {
        // consecutive atoms go to the next bank group, then the next column, bank and row
        const k = position[p]++;
        bank = (k & 3) * 4 + ((k >> 7) & 3);
        column = (k >> 2) & 31;
        row = (k >> 9) & 16383;
      }
      const handle = free.pop();
      records.ints[handle * RECORD_INTS + PLACE] = p;
      records.ints[handle * RECORD_INTS + FLAGS] = 0;
      sendToChannel(p, 0, at, bank, row, column, 1, handle, 0, 0, 0);
    }
  };
  const start = process.hrtime.bigint();
  for (let p = 0; p < total; p++) feed(p, 40);
  let edge = 0;
  for (let back = WINDOW; sent < requests || channelCounters().queued > 0; back += WINDOW) {
    runChannels(back);
    drainEgress(0, back >> 1, leave);
    for (const end = Math.floor((back * halfPs + DELAY_PS) / memory.clockPs); edge < end; edge++) {
      if (takeEdge(0, edge) === 0) continue;
      for (let p = 0; p < total; p++) credits[p] += takePair(edge, p) & 0xffff;
    }
    for (let p = 0; p < total; p++) feed(p, back + 40);
  }
  const seconds = Number(process.hrtime.bigint() - start) / 1e9;
  const reads = channelCounters().reads.reduce((sum, n) => sum + n, 0);
  return { perSecond: reads / seconds, sink: reads };
}
