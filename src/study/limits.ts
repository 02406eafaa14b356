import type { Package } from '../config/package.js';

/**
 * A limit that can be lifted by overriding keys of the package, as anyone could by hand. What is lifted is as far gone as the model
 * allows: a residue that stays is said in `residue`.
 */
export interface Limit {
  readonly key: string;
  readonly label: string; // for a table
  readonly lifts: string; // what is done, for people
  readonly residue: string; // '' when nothing of the limit is left
  overrides(pkg: Package): string[]; // `path=value`
}

// the engine's tables: see config/check-package.ts
const MOST_QUEUE_ENTRIES = 2 ** 20;
const MOST_IN_FLIGHT = 2 ** 21;
const MOST_WINDOW = 65536;
const DEEP = 4096; // entries of a queue: far more than a pseudo-channel can serve while anyone waits
const MOST_BANKS = 64; // of a pseudo-channel
const FAST = 1e9; // times: what is so much faster takes no time that shows

const timing = (values: Readonly<Record<string, string>>): string[] =>
  Object.entries(values).map(([name, value]) => `memory.0.timings.${name}=${value}`);
const eachDie = (pkg: Package, make: (die: Package['dies'][number], d: number) => string[]): string[] =>
  pkg.dies.flatMap(make);
const eachLink = (pkg: Package, make: (entry: number) => string): string[] =>
  [...new Set(pkg.links.map(({ entry }) => entry))].sort((a, b) => a - b).map(make);

/** Every limit that can be lifted, in the order of the way from DRAM up to the trace. Of two that set one key the later wins. */
export const LIMITS: readonly Limit[] = [
  {
    key: 'refresh',
    label: 'refresh',
    lifts: 'no refresh',
    residue: '',
    overrides: () => ['memory.0.refresh.mode=off'],
  },
  {
    key: 'turnaround',
    label: 'bus turnaround',
    lifts: 'reads and writes follow each other on the data bus without a gap',
    residue: 'one clock from writes to reads',
    // with latencies of one clock nothing is left to wait for; reads get theirs back on the way out, writes theirs in tWR
    overrides: ({ memory: [{ timings, clockPs, baseDie }] }) => [
      ...timing({
        RL: '1 ck',
        WL: '1 ck',
        tRTW: '0 ck',
        tWTR_S: '0 ck',
        tWTR_L: '0 ck',
        tWR: `${timings.tWR.ck + timings.WL.ck - 1} ck`,
      }),
      `memory.0.base_die.egress=${Math.round(baseDie.egressPs + (timings.RL.ck - 1) * clockPs)} ps`,
    ],
  },
  {
    key: 'row_cycle',
    label: 'row cycle',
    lifts: 'rows open and close at once (tRC, tRAS, tRP, tRCD, tRTP, tWR, tPPD)',
    residue: 'one clock each to open and to close, and a write’s own burst',
    overrides: () =>
      timing({
        tRC: '2 ck',
        tRAS: '1 ck',
        tRP: '1 ck',
        tRCDRD: '1 ck',
        tRCDWR: '1 ck',
        tRTP: '0 ck',
        tWR: '0 ck',
        tPPD: '0 ck',
      }),
  },
  {
    key: 'activate_window',
    label: 'activate window',
    lifts: 'rows may be opened in any number at once (tRRD, tFAW)',
    residue: '',
    overrides: () => timing({ tRRD_S: '0 ck', tRRD_L: '0 ck', tFAW: '0 ck' }),
  },
  {
    key: 'column_gap',
    label: 'column gap',
    lifts: 'bursts follow each other in any bank group (tCCD_L, tCCD_R)',
    residue: '',
    overrides: ({ memory: [{ organisation: o }] }) =>
      timing({ tCCD_S: `${o.burst_ck} ck`, tCCD_L: `${o.burst_ck} ck`, tCCD_R: `${o.burst_ck} ck` }),
  },
  {
    key: 'command_bus',
    label: 'command bus',
    lifts: 'a row and a column bus, half a clock a command',
    residue: 'half a clock a command',
    overrides: () => [
      'memory.0.command_buses={ separate: true, act: 0.5 ck, precharge: 0.5 ck, refresh: 0.5 ck, column: 0.5 ck }',
    ],
  },
  {
    key: 'banks',
    label: 'banks',
    lifts: `as many banks as the engine holds (${MOST_BANKS} a pseudo-channel), each with fewer rows`,
    residue: 'rows still conflict, less often',
    overrides: moreBanks,
  },
  {
    key: 'queues',
    label: 'queue depth',
    lifts: 'queues of the controllers as deep as the engine holds, watermarks in proportion',
    residue: '',
    overrides: ({ memory: [{ organisation: o, controller: c }] }) => {
      const total = o.stacks * o.channels * o.pseudo_channels;
      const room = Math.max(1, Math.min(DEEP, Math.floor(MOST_QUEUE_ENTRIES / total / 2)));
      const [read, write] = [Math.max(c.readQueue, room), Math.max(c.writeQueue, room)];
      const high = Math.max(1, Math.floor((c.drainHigh * write) / c.writeQueue));
      const low = Math.min(high - 1, Math.floor((c.drainLow * write) / c.writeQueue));
      const at = 'memory.0.controller';
      return [
        `${at}.read_queue=${read}`,
        `${at}.write_queue=${write}`,
        `${at}.drain_high=${high}`,
        `${at}.drain_low=${low}`,
      ];
    },
  },
  {
    key: 'imbalance',
    label: 'imbalance',
    lifts:
      'each round over stacks, channels and pseudo-channels turned by a hash, so that no stride meets in few of them',
    residue: 'chance, one address asked for far more often than others, and what is uneven between dies',
    overrides: () => ['address_map.rotate=true'],
  },
  {
    key: 'link_rate',
    label: 'link rate',
    lifts: 'links at 1000 GT/s a lane, the most a package may have',
    residue: 'the time of flits at that rate',
    overrides: (pkg) => eachLink(pkg, (entry) => `links.${entry}.rate=1000 GT/s`),
  },
  {
    key: 'link_latency',
    label: 'link latency',
    lifts: 'links and base dies without latency',
    residue: 'two DRAM clocks a round trip',
    overrides: (pkg) => [
      ...eachLink(pkg, (entry) => `links.${entry}.latency=0 ps`),
      `memory.0.base_die.ingress=${Math.ceil(2 * pkg.memory[0].clockPs)} ps`,
      'memory.0.base_die.egress=0 ps',
    ],
  },
  {
    key: 'credits',
    label: 'landing credits',
    lifts: 'room for all data that can be under way',
    residue: '',
    overrides: (pkg) => eachLink(pkg, (entry) => `links.${entry}.landing=1 GiB`),
  },
  {
    key: 'window',
    label: 'request window',
    lifts: 'as many requests outstanding as the engine holds',
    residue: '',
    overrides: (pkg) => {
      const engines = pkg.dies.reduce((sum, die) => sum + die.engines, 0);
      const most = Math.min(MOST_WINDOW, Math.floor(MOST_IN_FLIGHT / engines));
      return eachDie(pkg, ({ window }, d) => [`compute.${d}.window=${Math.max(window, most)}`]);
    },
  },
  {
    key: 'issue',
    label: 'issue rate',
    lifts: '16 requests an engine and clock',
    residue: '',
    overrides: (pkg) => eachDie(pkg, (_, d) => [`compute.${d}.issue_per_clock=16`]),
  },
  {
    key: 'buffering',
    label: 'tile buffers',
    lifts: '64 tiles loading or waiting at once',
    residue: '',
    overrides: (pkg) => eachDie(pkg, (_, d) => [`compute.${d}.buffering=64`]),
  },
  {
    key: 'compute',
    label: 'compute',
    lifts: 'every number format computed at once',
    residue: '',
    overrides: (pkg) =>
      eachDie(pkg, ({ peakFlops }, d) =>
        Object.keys(peakFlops).length === 0
          ? []
          : [
              `compute.${d}.peak=${JSON.stringify(Object.fromEntries(Object.keys(peakFlops).map((format) => [format, `${FAST} PFLOP/s`])))}`,
            ],
      ),
  },
];

/** Rows given over to banks: twice as many of them for every row bit, taken where the fields have banks now. */
function moreBanks({ memory: [{ organisation: o }], addressMap }: Package): string[] {
  const banks = o.sids * o.bank_groups * o.banks_per_group;
  let bits = 0;
  while (banks * 2 ** (bits + 1) <= MOST_BANKS && o.rows % 2 ** (bits + 1) === 0) bits++;
  const own = addressMap.fields.findIndex(({ name }) => name === 'bank');
  const row = addressMap.fields.findLastIndex(({ name, bits: count }) => name === 'row' && count >= bits);
  if (bits === 0 || own < 0 || row < 0) return [];
  const rowBits = Math.ceil(Math.log2(o.rows)) - bits;
  const fields = addressMap.fields
    .map(({ name, bits: count }, i) => `${name}:${count + (i === own ? bits : i === row ? -bits : 0)}`)
    .filter((field) => !field.endsWith(':0'));
  // folding keeps to the rows there still are
  const folds = addressMap.xor
    .map(({ target, bit, rowBits: from }) => ({ key: `${target}.${bit}`, from: from.filter((at) => at < rowBits) }))
    .filter(({ from }) => from.length > 0);
  const at = 'memory.0.organisation';
  return [
    `${at}.banks_per_group=${o.banks_per_group * 2 ** bits}`,
    `${at}.rows=${o.rows / 2 ** bits}`,
    `address_map.fields=[${fields.join(', ')}]`,
    `address_map.xor={ ${folds.map(({ key, from }) => `${key}: [${from.map((bit) => `row.${bit}`).join(', ')}]`).join(', ')} }`,
  ];
}
