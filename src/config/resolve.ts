import { createHash } from 'node:crypto';
import { InputError, type Where } from '../errors.js';
import { formatTime, parseBytes, parseFlopRate, parseLength, parseTransfers } from '../units.js';
import type { ComputeDie, Link, MemoryGroup, Package } from './package.js';
import { resolveMap } from './resolve-map.js';
import { resolveMemory } from './resolve-memory.js';
import type { PackageFile } from './schema.js';
import { locate, type Path, type Tree } from './tree.js';
import { clockPeriod, LONGEST_LATENCY_PS, latency, type Place, positive, unknownName, whole } from './values.js';

const MOST_FLIT = 2 ** 16; // bytes, of a flit and of headers
const MOST_LANDING = 2 ** 30;
const MOST_TRANSFERS = 1e12; // a second and lane: beyond any wire

/** Turns a valid document into a Package: units to numbers, names to indices, presets filled in. */
export function resolve(file: PackageFile, tree: Tree, fileName: string): Package {
  const place: Place = (path) => locate(tree, path);
  const memory = file.memory.map((group, i) => resolveMemory(group, ['memory', i], place));
  const dies = file.compute.map((die, i) => resolveDie(die, ['compute', i], place));
  distinct(
    file.compute.map((die) => die.name),
    'compute',
    place,
  );
  const links = resolveLinks(file.links, file, memory, place);
  const resolved = {
    name: file.name,
    caution: file.caution,
    dies,
    memory,
    links,
    addressMap: resolveMap(file.address_map, memory[0], place),
  };
  const hash = createHash('sha256').update(JSON.stringify(resolved, sorted)).digest('hex');
  return freeze({ ...resolved, file: fileName, hash });
}

/** For JSON.stringify: maps with their keys in order, so that the order they were written in does not show in the hash. */
function sorted(_: string, value: unknown): unknown {
  if (typeof value !== 'object' || value === null || Array.isArray(value)) return value;
  return Object.fromEntries(Object.entries(value).sort(([a], [b]) => (a < b ? -1 : 1)));
}

function resolveDie(die: PackageFile['compute'][number], path: Path, place: Place): ComputeDie {
  const at = (key: string): Where => place([...path, key]);
  return {
    name: die.name,
    clockPs: clockPeriod(die.clock, at('clock')),
    engines: die.engines,
    window: die.window,
    issuePerClock: die.issue_per_clock,
    buffering: die.buffering,
    requestBytes: whole(
      positive(parseBytes(die.request, at('request')), die.request, at('request')),
      at('request'),
      'bytes',
    ),
    peakFlops: Object.fromEntries(
      Object.entries(die.peak).map(([format, rate]) => [
        format,
        positive(parseFlopRate(rate, place([...path, 'peak', format])), rate, place([...path, 'peak', format])),
      ]),
    ),
    edgeMm: die.edge === undefined ? 0 : positive(parseLength(die.edge, at('edge')), die.edge, at('edge')),
  };
}

/** Expands `hbm.0-2` to one link a stack and sorts by stack; every stack must end up with exactly one. */
function resolveLinks(
  links: PackageFile['links'],
  file: PackageFile,
  memory: readonly MemoryGroup[],
  place: Place,
): Link[] {
  const [group] = memory;
  const byStack = new Map<number, Link>();
  distinct(
    links.map((link) => link.name),
    'links',
    place,
  );
  links.forEach((link, i) => {
    const path = ['links', i];
    const die = file.compute.findIndex((candidate) => candidate.name === link.from);
    if (die < 0)
      throw unknownName(
        link.from,
        file.compute.map((c) => c.name),
        'a compute die',
        place([...path, 'from']),
      );
    const stacks = stacksOf(link.to, group, place([...path, 'to']));
    for (const stack of stacks) {
      const taken = byStack.get(stack);
      if (taken !== undefined) {
        throw new InputError({
          where: place([...path, 'to']),
          found: `a second link to stack ${group.name}.${stack}, which link '${taken.name}' already reaches`,
          expected: 'exactly one link a stack',
        });
      }
      const name = stacks.length === 1 ? link.name : `${link.name}.${stack - stacks[0]}`;
      byStack.set(stack, resolveLink(link, name, i, die, stack, path, place));
    }
  });
  const alike = sameName([...byStack.values()]);
  if (alike !== null) {
    const [first, second] = alike;
    throw new InputError({
      where: place(['links']),
      found: `the name '${first.name}' for the links to stacks ${first.stack} and ${second.stack}: those of a range get .0, .1 … behind it`,
      expected: 'a name of its own for each link',
    });
  }
  const missing = Array.from({ length: group.organisation.stacks }, (_, s) => s).filter((s) => !byStack.has(s));
  if (missing.length > 0) {
    throw new InputError({
      where: place(['links']),
      found: `no link to stack ${missing.map((s) => `${group.name}.${s}`).join(', ')}`,
      expected: 'exactly one link a stack',
    });
  }
  file.compute.forEach((die, d) => {
    if ([...byStack.values()].some((link) => link.die === d)) return;
    throw new InputError({
      where: place(['compute', d, 'name']),
      found: `compute die '${die.name}' without a link to any stack`,
      expected: 'at least one link from each compute die; routes through other dies are not modelled yet',
    });
  });
  return [...byStack.values()].sort((a, b) => a.stack - b.stack);
}

/** The first two links that came out with one name, null when each has its own. */
function sameName(links: readonly Link[]): readonly [Link, Link] | null {
  for (const [i, second] of links.entries()) {
    const first = links.slice(0, i).find((link) => link.name === second.name);
    if (first !== undefined) return [first, second];
  }
  return null;
}

function resolveLink(
  link: PackageFile['links'][number],
  name: string,
  entry: number,
  die: number,
  stack: number,
  path: Path,
  place: Place,
): Link {
  const at = (key: string): Where => place([...path, key]);
  const size = (key: 'flit' | 'flit_overhead' | 'request_header' | 'response_header' | 'ack' | 'landing'): number => {
    const bytes = whole(parseBytes(link[key], at(key)), at(key), 'bytes');
    if (bytes > (key === 'landing' ? MOST_LANDING : MOST_FLIT)) {
      const most = key === 'landing' ? '1 GiB' : '64 KiB';
      throw new InputError({ where: at(key), found: `'${link[key]}'`, expected: `at most ${most}` });
    }
    return key === 'flit_overhead' ? bytes : positive(bytes, link[key], at(key));
  };
  const transfersPerS = positive(parseTransfers(link.rate, at('rate')), link.rate, at('rate'));
  if (transfersPerS > MOST_TRANSFERS) {
    throw new InputError({ where: at('rate'), found: `'${link.rate}'`, expected: 'at most 1000 GT/s a lane' });
  }
  const flitBytes = size('flit');
  const flitOverheadBytes = size('flit_overhead');
  if (flitOverheadBytes < 0 || flitOverheadBytes >= flitBytes) {
    throw new InputError({
      where: at('flit_overhead'),
      found: `a flit of ${flitBytes} B with ${flitOverheadBytes} B of overhead`,
      expected: 'an overhead from 0 B to less than the flit',
    });
  }
  const rawBytesPerS = (link.lanes * transfersPerS) / 8;
  const flitPs = (flitBytes * 1e12) / rawBytesPerS; // both sides are exact for whole rates below 2^53 bit/s, so it is rounded once
  if (flitPs > LONGEST_LATENCY_PS) {
    throw new InputError({
      where: at('rate'),
      found: `'${link.rate}' over ${link.lanes} lanes: a flit of ${flitBytes} B takes ${formatTime(flitPs)}`,
      expected: `at most ${formatTime(LONGEST_LATENCY_PS)} a flit`,
    });
  }
  return {
    name,
    entry,
    die,
    stack,
    lanes: link.lanes,
    transfersPerS,
    flitBytes,
    flitOverheadBytes,
    flitPs,
    requestHeaderBytes: size('request_header'),
    responseHeaderBytes: size('response_header'),
    ackBytes: size('ack'),
    latencyPs: latency(link.latency, at('latency')),
    landingBytes: size('landing'),
    rawBytesPerS,
    payloadBytesPerS: (rawBytesPerS * (flitBytes - flitOverheadBytes)) / flitBytes,
  };
}

/** Stack numbers of `hbm.0-2` or `hbm.4`. */
function stacksOf(text: string, group: MemoryGroup, where: Where): number[] {
  const match = /^(.+)\.(\d+)(?:-(\d+))?$/.exec(text);
  const last = group.organisation.stacks - 1;
  const expected = `a stack of memory '${group.name}', ${group.name}.0 to ${group.name}.${last}, or a range such as ${group.name}.0-${last}`;
  if (match === null) throw new InputError({ where, found: `'${text}'`, expected });
  const [, name, from, to] = match;
  const [first, end] = [Number(from), Number(to ?? from)];
  if (name !== group.name || first > end || end > last) throw new InputError({ where, found: `'${text}'`, expected });
  return Array.from({ length: end - first + 1 }, (_, i) => first + i);
}

function distinct(names: readonly string[], list: string, place: Place): void {
  names.forEach((name, i) => {
    if (names.indexOf(name) === i) return;
    throw new InputError({
      where: place([list, i, 'name']),
      found: `a second '${name}'`,
      expected: 'a name of its own',
    });
  });
}

function freeze<T>(value: T): T {
  if (typeof value === 'object' && value !== null) {
    for (const part of Object.values(value)) freeze(part);
    Object.freeze(value);
  }
  return value;
}
