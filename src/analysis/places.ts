import type { Package } from '../config/package.js';
import type { Recording } from '../engine/recording.js';
import type { Result } from './result-schema.js';
import { stackOfRows } from './stacks.js';
import { sum } from './sums.js';

/** A pseudo-channel's place: p = (stack x channels + channel) x pseudo_channels + pseudo_channel. */
interface Place {
  readonly p: number;
  readonly stack: number;
  readonly channel: number;
  readonly pseudo_channel: number;
}

function placesOf(pkg: Package): Place[] {
  const { stacks, channels, pseudo_channels } = pkg.memory[0].organisation;
  return Array.from({ length: stacks * channels * pseudo_channels }, (_, p) => ({
    p,
    stack: Math.floor(p / (channels * pseudo_channels)),
    channel: Math.floor(p / pseudo_channels) % channels,
    pseudo_channel: p % pseudo_channels,
  }));
}

/** The places split into runs of those for which `key` is equal, in order. */
function grouped(places: readonly Place[], key: (place: Place) => number): Place[][] {
  const groups: Place[][] = [];
  for (const place of places) {
    const last = groups[groups.length - 1];
    if (last !== undefined && key(last[0]) === key(place)) last.push(place);
    else groups.push([place]);
  }
  return groups;
}

type Places = Pick<Result['bandwidth'], 'stacks' | 'channels' | 'pseudo_channels'>;

/** Bandwidth and row figures of each stack, channel and pseudo-channel. */
export function bandwidthByPlace(pkg: Package, recording: Recording): Places {
  const { dram, makespanPs, elapsedCk, bandwidthStack } = recording;
  const atom = pkg.memory[0].organisation.atom_bytes;
  const seconds = makespanPs / 1e12;
  const rate = (atoms: number): number => (seconds > 0 ? (atoms * atom) / seconds : 0);
  const traffic = (places: readonly Place[]) => {
    const reads = sum(places.map(({ p }) => dram.reads[p]));
    const writes = sum(places.map(({ p }) => dram.writes[p]));
    return {
      achieved_bytes_per_s: rate(reads + writes),
      read_bytes_per_s: rate(reads),
      write_bytes_per_s: rate(writes),
    };
  };
  const mean = (integral: number): number => (elapsedCk > 0 ? integral / elapsedCk : 0);
  const places = placesOf(pkg);
  const channelsPerStack = pkg.memory[0].organisation.channels;
  return {
    stacks: grouped(places, ({ stack }) => stack).map((group) => ({
      stack: group[0].stack,
      ...traffic(group),
      bandwidth_stack: stackOfRows(bandwidthStack, group[0].p, group[0].p + group.length),
    })),
    channels: grouped(places, ({ stack, channel }) => stack * channelsPerStack + channel).map((group) => ({
      stack: group[0].stack,
      channel: group[0].channel,
      ...traffic(group),
    })),
    pseudo_channels: places.map(({ p, ...place }) => ({
      ...place,
      ...traffic([{ p, ...place }]),
      row_hits: dram.rowHits[p],
      row_misses: dram.rowMisses[p],
      row_conflicts: dram.rowConflicts[p],
      activates: dram.activates[p],
      refreshes: dram.refreshesAll[p] + dram.refreshesBank[p],
      read_queue_mean_entries: mean(dram.readQueueCk[p]),
      write_queue_mean_entries: mean(dram.writeQueueCk[p]),
    })),
  };
}

/** Queue occupancy: mean entries of one pseudo-channel over time, and the deepest any of them was. */
export function queueOccupancy(pkg: Package, { dram, elapsedCk }: Recording): Result['queues'] {
  const of = (places: readonly Place[], integral: Float64Array, deepest: Int32Array) => ({
    mean_entries: elapsedCk > 0 ? sum(places.map(({ p }) => integral[p])) / (elapsedCk * places.length) : 0,
    max_entries: Math.max(0, ...places.map(({ p }) => deepest[p])),
  });
  const both = (places: readonly Place[]) => ({
    read: of(places, dram.readQueueCk, dram.readQueueMax),
    write: of(places, dram.writeQueueCk, dram.writeQueueMax),
  });
  const places = placesOf(pkg);
  const stacks = grouped(places, ({ stack }) => stack).map((group) => ({ ...both(group), stack: group[0].stack }));
  return { ...both(places), stacks };
}
