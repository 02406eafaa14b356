import { InputError } from '../errors.js';
import type { MemoryGroup, TimingName } from './package.js';
import type { Path } from './tree.js';
import type { Place } from './values.js';

/** Refuses timings that contradict each other or an organisation that cannot work, naming the rule that fails. */
export function checkMemory({ organisation: o, timings, refresh, buses }: MemoryGroup, path: Path, place: Place): void {
  const ck = (name: TimingName): number => timings[name].ck;
  const rule = (holds: boolean, at: TimingName, text: string, ...names: TimingName[]): void => {
    if (holds) return;
    throw new InputError({
      where: place([...path, 'timings', at]),
      found: names.map((name) => `${name} = ${ck(name)} ck`).join(', '),
      expected: text,
    });
  };
  for (const name of [
    'tRC',
    'tRAS',
    'tRP',
    'tRCDRD',
    'tRCDWR',
    'tCCD_S',
    'tCCD_L',
    'RL',
    'WL',
    'tREFI',
    'tRFCab',
    'tRFCpb',
  ] as const) {
    rule(ck(name) > 0, name, 'at least one clock', name);
  }
  // each is rounded up to clocks on its own, so the sum may come out one clock longer
  rule(ck('tRC') >= ck('tRAS') + ck('tRP') - 1, 'tRC', 'tRC of at least tRAS + tRP', 'tRC', 'tRAS', 'tRP');
  rule(ck('tRAS') >= ck('tRCDRD'), 'tRAS', 'tRAS of at least tRCDRD', 'tRAS', 'tRCDRD');
  rule(ck('tCCD_L') >= ck('tCCD_S'), 'tCCD_L', 'tCCD_L of at least tCCD_S', 'tCCD_L', 'tCCD_S');
  rule(ck('tCCD_R') >= ck('tCCD_S'), 'tCCD_R', 'tCCD_R of at least tCCD_S', 'tCCD_R', 'tCCD_S');
  rule(ck('tRRD_L') >= ck('tRRD_S'), 'tRRD_L', 'tRRD_L of at least tRRD_S', 'tRRD_L', 'tRRD_S');
  rule(ck('tFAW') >= ck('tRRD_S'), 'tFAW', 'tFAW of at least tRRD_S', 'tFAW', 'tRRD_S');
  rule(ck('tWTR_L') >= ck('tWTR_S'), 'tWTR_L', 'tWTR_L of at least tWTR_S', 'tWTR_L', 'tWTR_S');
  rule(
    ck('RL') + o.burst_ck + ck('tRTW') >= ck('WL'),
    'WL',
    'a write burst that starts after the read burst before it: WL of at most RL + burst + tRTW',
    'WL',
    'RL',
    'tRTW',
  );
  if (ck('tCCD_S') < o.burst_ck) {
    throw new InputError({
      where: place([...path, 'timings', 'tCCD_S']),
      found: `tCCD_S = ${ck('tCCD_S')} ck and a burst of ${o.burst_ck} ck`,
      expected: 'tCCD_S of at least the burst: the data bus carries one burst at a time',
    });
  }
  // the longest that a row may need from its ACT until its bank is closed again: between two refreshes there must be room for it
  const halfBus = buses.actHalfCk + buses.preHalfCk + buses.refHalfCk + (buses.separate ? 0 : buses.columnHalfCk);
  const busCk = (halfBus * o.pseudo_channels) / 2; // the channel's row bus, for one row and one refresh of each pseudo-channel
  const rowCycle = Math.max(ck('tRC'), ck('tRCDWR') + ck('WL') + o.burst_ck + ck('tWR') + ck('tRP')) + busCk;
  if (refresh.mode === 'all-bank') {
    rule(
      ck('tREFI') > ck('tRFCab') + rowCycle,
      'tREFI',
      `tREFI longer than tRFCab and the ${rowCycle} ck of one row's use, or nothing but refresh happens`,
      'tREFI',
      'tRFCab',
    );
  }
  if (refresh.mode === 'per-bank') {
    const banks = o.bank_groups * o.banks_per_group * o.sids;
    rule(
      ck('tREFI') / banks >= ck('tRREFD') + ck('tRRD_L'),
      'tREFI',
      `tREFI / ${banks} banks of at least tRREFD + tRRD_L: between the refreshes of two banks there must be room for an ACT`,
      'tREFI',
      'tRREFD',
      'tRRD_L',
    );
    rule(
      ck('tREFI') / banks >= busCk,
      'tREFI',
      `tREFI / ${banks} banks of at least the ${busCk} ck that an ACT, a precharge and a refresh of each pseudo-channel hold the row bus`,
      'tREFI',
    );
    if (refresh.refpbInActivateWindow) {
      rule(
        (2 * ck('tREFI')) / banks >= ck('tFAW'),
        'tREFI',
        `2 x tREFI / ${banks} banks of at least tFAW, in which per-bank refreshes count as activations`,
        'tREFI',
        'tFAW',
      );
    }
    rule(
      ck('tREFI') > ck('tRFCpb') + rowCycle,
      'tREFI',
      `tREFI longer than tRFCpb and the ${rowCycle} ck of one row's use`,
      'tREFI',
      'tRFCpb',
    );
    if (o.bank_groups * o.banks_per_group > 32) {
      throw new InputError({
        where: place([...path, 'refresh', 'mode']),
        found: 'per-bank refresh of more than 32 banks a stack ID',
        expected: 'all-bank refresh',
      });
    }
  }
  if (o.bank_groups * o.banks_per_group * o.sids > 64 || o.bank_groups * o.sids > 32) {
    throw new InputError({
      where: place([...path, 'organisation']),
      found: `${o.bank_groups * o.banks_per_group * o.sids} banks in ${o.bank_groups * o.sids} groups a pseudo-channel`,
      expected: 'at most 64 banks in 32 groups',
    });
  }
}
