import type { Domain, Package } from '../config/package.js';
import { InputError } from '../errors.js';
import type { AddressMap } from '../model/address-map.js';
import type { DieGeometry, Trace } from '../trace/batch.js';
import { placeKernels } from '../trace/place.js';
import { createTileWalk } from '../trace/walk.js';
import { KernelWork } from './kernel-work.js';
import type { RunOptions } from './recording.js';
import type { Timers } from './timers.js';
import { TraceWork } from './trace-work.js';
import type { Runnable, Work } from './work.js';

/** What trace expansion must know of each compute die. */
export function geometryOf(pkg: Package, places: readonly Domain[]): DieGeometry[] {
  return places.map(({ die, base, capacity }) => ({
    base,
    capacity,
    engines: pkg.dies[die].engines,
    requestBytes: pkg.dies[die].requestBytes,
  }));
}

/** The engines' work for either kind of trace. */
export function makeWork(
  pkg: Package,
  trace: Trace,
  places: readonly Domain[],
  map: AddressMap,
  options: RunOptions,
  timers: Timers,
  runnable: Runnable,
): Work {
  if (trace.kind === 'access') {
    if (options.replay !== 'closed' && !trace.hasTime) throw needsTimes(options.replay, trace.file);
    return new TraceWork(pkg, trace, map, options.replay, timers, runnable);
  }
  if (options.replay !== 'closed') throw needsTimes(options.replay, trace.file);
  const geometry = geometryOf(pkg, places);
  const placed = placeKernels(trace, geometry);
  return new KernelWork(pkg, trace, placed, () => createTileWalk(options.seed, geometry), timers, runnable);
}

function needsTimes(replay: string, file: string): InputError {
  return new InputError({
    where: { file },
    found: `a trace without recorded times, to be replayed ${replay}`,
    expected: 'an access trace with a time_ps, time_ns, time_us or cycle column, or --replay closed',
  });
}
