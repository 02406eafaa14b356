import { InputError, type Where } from '../errors.js';
import { parseSeparation, parseTemperature, parseTime } from '../units.js';
import { checkMemory } from './check.js';
import { DEVICES } from './devices/index.js';
import type { CommandBuses, Controller, MemoryGroup, Organisation, Timing, TimingName } from './package.js';
import { TIMING_NAMES } from './package.js';
import type { PackageFile } from './schema.js';
import { toClocks } from './timing.js';
import type { Path } from './tree.js';
import { clockPeriod, latency, negative, type Place, positive, unknownName } from './values.js';

type MemoryFile = PackageFile['memory'][number];

const OVERRIDE = 'package file';
const REFRESH_TIMES: ReadonlySet<TimingName> = new Set(['tREFI', 'tRFCab', 'tRFCpb']);
const MOST_REFRESH_CK = 2 ** 20; // their longest: ten of them still fit the engine's clock
const MOST_CK = 2 ** 12; // longest of the others, some microseconds: what is under way in that time has to be kept
const MOST_WAIT_CK = 2 ** 26; // longest age bound and page timeout, for the same reason
const MOST_PIPELINE_CK = 2 ** 14; // answers under way in the pipeline have a place for each of its clocks
const HOT = 85; // degrees Celsius above which refresh runs at twice the rate (JESD79-5 MR4, through a cross-standard digest)

/** One memory group: the device preset, with what the package file says laid over it. */
export function resolveMemory(file: MemoryFile, path: Path, place: Place): MemoryGroup {
  const at = (...keys: string[]): Where => place([...path, ...keys]);
  const device = DEVICES.get(file.device);
  if (device === undefined) throw unknownName(file.device, [...DEVICES.keys()], 'a device preset', at('device'));
  const clockText = file.clock ?? device.clock.value;
  const clockPs = clockPeriod(clockText, at('clock'));
  const organisation = {
    stacks: file.stacks,
    ...Object.fromEntries(
      Object.entries(device.organisation).map(([name, { value }]) => [
        name,
        file.organisation?.[name as Exclude<keyof Organisation, 'stacks'>] ?? value,
      ]),
    ),
  } as Organisation;

  const temperatureC = parseTemperature(file.refresh.temperature, at('refresh', 'temperature'));
  if (temperatureC < -55 || temperatureC > 150) {
    throw new InputError({
      where: at('refresh', 'temperature'),
      found: `'${file.refresh.temperature}'`,
      expected: 'a junction temperature from -55 C to 150 C',
    });
  }
  const timings = Object.fromEntries(
    TIMING_NAMES.map((name): [TimingName, Timing] => {
      const given = file.timings?.[name];
      const where = at('timings', name);
      const separation = parseSeparation(given ?? device.timings[name].value, where);
      if (separation.ps < 0) throw negative(given ?? '', where);
      let ck = toClocks(separation, clockPs, name === 'tREFI' ? 'down' : 'up');
      let source = given === undefined ? device.timings[name].source : OVERRIDE;
      const most = REFRESH_TIMES.has(name) ? MOST_REFRESH_CK : MOST_CK;
      if (ck > most) {
        const found = `'${given ?? device.timings[name].value}', ${ck} ck`;
        throw new InputError({ where, found, expected: `at most ${most} ck` });
      }
      if (name === 'tREFI' && temperatureC > HOT) {
        ck = Math.floor(ck / 2);
        source += `, halved above ${HOT} C`;
      }
      return [name, { ck, ns: Number(((ck * clockPs) / 1000).toPrecision(12)), source }];
    }),
  ) as Record<TimingName, Timing>;

  const group: MemoryGroup = {
    name: file.name,
    device: file.device,
    clockPs,
    peakBytesPerS:
      (organisation.channels * organisation.pseudo_channels * organisation.atom_bytes * 1e12) /
      (organisation.burst_ck * clockPs),
    organisation,
    timings,
    activateWindowScope: file.activate_window_scope ?? device.activateWindowScope.value,
    buses: resolveBuses(file.command_buses, device.buses.value, [...path, 'command_buses'], place),
    refresh: {
      mode: file.refresh.mode,
      scope: file.refresh.scope ?? device.refreshScope.value,
      postpone: file.refresh.postpone ?? device.postpone.value,
      pullIn: file.refresh.pull_in ?? device.pullIn.value,
      temperatureC,
      refpbInActivateWindow: device.refpbInActivateWindow.value,
    },
    controller: resolveController(file.controller, clockPs, [...path, 'controller'], place),
    baseDie: {
      ingressPs: latency(file.base_die.ingress, at('base_die', 'ingress')),
      egressPs: latency(file.base_die.egress, at('base_die', 'egress')),
    },
    notes: [device.title, ...device.notes],
  };
  checkMemory(group, path, place);
  return group;
}

const LONGEST_COMMAND_HALF_CK = 64; // common practice, no source: no device comes near it

function resolveBuses(
  file: MemoryFile['command_buses'],
  device: CommandBuses,
  path: Path,
  place: Place,
): MemoryGroup['buses'] {
  const half = (key: 'act' | 'precharge' | 'refresh' | 'column', otherwise: number): number => {
    const text = file?.[key];
    if (text === undefined) return otherwise;
    const clocks = Number(/^(\d+(?:\.[05])?)\s*ck$/.exec(text.trim())?.[1]);
    if (clocks > 0 && 2 * clocks <= LONGEST_COMMAND_HALF_CK) return 2 * clocks;
    throw new InputError({
      where: place([...path, key]),
      found: `'${text}'`,
      expected: `whole or half clocks from 0.5 ck to ${LONGEST_COMMAND_HALF_CK / 2} ck, for example 1.5 ck`,
    });
  };
  return {
    separate: file?.separate ?? device.separate,
    actHalfCk: half('act', device.actHalfCk),
    preHalfCk: half('precharge', device.preHalfCk),
    refHalfCk: half('refresh', device.refHalfCk),
    columnHalfCk: half('column', device.columnHalfCk),
  };
}

function resolveController(file: MemoryFile['controller'], clockPs: number, path: Path, place: Place): Controller {
  const at = (key: string): Where => place([...path, key]);
  const clocks = (key: 'age_bound' | 'page_timeout' | 'pipeline'): number => {
    const ck = Math.ceil(positive(parseTime(file[key], at(key)), file[key], at(key)) / clockPs - 1e-9);
    const most = key === 'pipeline' ? MOST_PIPELINE_CK : MOST_WAIT_CK;
    if (ck <= most) return ck;
    throw new InputError({ where: at(key), found: `'${file[key]}', ${ck} ck`, expected: `at most ${most} ck` });
  };
  const drainHigh = file.drain_high ?? Math.max(1, Math.floor((file.write_queue * 3) / 4));
  const drainLow = file.drain_low ?? Math.min(Math.floor(file.write_queue / 4), drainHigh - 1);
  if (drainHigh > file.write_queue) {
    throw new InputError({
      where: at('drain_high'),
      found: `a high watermark of ${drainHigh} for a write queue of ${file.write_queue}`,
      expected: `at most ${file.write_queue}: above it draining would never start`,
    });
  }
  if (drainLow >= drainHigh) {
    throw new InputError({
      where: at('drain_low'),
      found: `a low watermark of ${drainLow} and a high one of ${drainHigh}`,
      expected: 'a low watermark below the high one',
    });
  }
  return {
    readQueue: file.read_queue,
    writeQueue: file.write_queue,
    scheduler: file.scheduler,
    hitCap: file.hit_cap,
    ageBoundCk: clocks('age_bound'),
    page: file.page,
    pageTimeoutCk: clocks('page_timeout'),
    drainHigh,
    drainLow,
    pipelineCk: clocks('pipeline'),
  };
}
