/**
 * Walks the accesses of a tile: the lazy expansion of a kernel's pattern. Hot: an engine calls `fill` for every access it sends,
 * so nothing is allocated per access and `fill` is one choice of pattern and then a tight loop.
 */
import { copyWords, hashSeed, mixNumber } from '../random.js';
import { type DieGeometry, type PlacedKernel, READ, type TileWalk } from './batch.js';
import { GranuleWalk } from './granules.js';
import { RunWalk } from './runs.js';
import { cut } from './share.js';

/** Makes a walker for one engine context. `geometry` has one entry a compute die. */
export function createTileWalk(seed: string, geometry: readonly DieGeometry[]): TileWalk {
  return new TileWalker(
    seed,
    geometry.map((die) => die.requestBytes),
  );
}

class TileWalker implements TileWalk {
  chained = false;

  private readonly seedName;
  private readonly sideName; // hash of (seed, kernel, die, side)
  private readonly runs = new RunWalk();
  private readonly granules = new GranuleWalk();

  // the side of a kernel on a die that the walks below are set up for
  private placed: PlacedKernel | null = null;
  private kernelIndex = -1;
  private die = -1;
  private side = -1;

  private kind: 'none' | 'runs' | 'granules' = 'none';
  private total = 0; // bytes of the die's share of this side
  private tiles = 0;
  private done = true; // the tile begun has nothing (more) to give

  constructor(
    seed: string,
    private readonly requestBytes: readonly number[], // longest request of each die
  ) {
    this.seedName = hashSeed(seed);
    this.sideName = copyWords(this.seedName, { x: 0, y: 0, z: 0, w: 0 });
  }

  begin(placed: PlacedKernel, kernelIndex: number, die: number, side: number, tile: number): void {
    if (placed !== this.placed || kernelIndex !== this.kernelIndex || die !== this.die || side !== this.side) {
      this.enterSide(placed, kernelIndex, die, side);
    }
    this.done = this.kind === 'none' || tile < 0 || tile >= this.tiles;
    if (this.done) return;
    const from = cut(this.total, tile, this.tiles);
    const to = cut(this.total, tile + 1, this.tiles);
    if (this.kind === 'runs') this.runs.begin(from, to);
    else this.granules.begin(from, to, tile);
  }

  fill(address: Float64Array, bytes: Int32Array, from: number, room: number): number {
    if (this.done) return 0;
    return this.kind === 'runs'
      ? this.runs.fill(address, bytes, from, room)
      : this.granules.fill(address, bytes, from, room);
  }

  /** Sets up what all tiles of one side of a kernel on a die share. */
  private enterSide(placed: PlacedKernel, kernelIndex: number, die: number, side: number): void {
    const share = placed.shares[die];
    const read = side === READ;
    const pattern = read ? placed.kernel.read : placed.kernel.write;
    const base = read ? share.readBase : share.writeBase;
    const span = read ? share.readSpan : share.writeSpan;
    this.placed = placed;
    this.kernelIndex = kernelIndex;
    this.die = die;
    this.side = side;
    this.total = read ? share.readBytes : share.writeBytes;
    this.tiles = share.tiles;
    this.chained = pattern?.name === 'chase';
    if (pattern === null || this.total === 0) {
      this.kind = 'none';
    } else if (pattern.name === 'sequential' || pattern.name === 'strided' || pattern.name === 'block') {
      this.kind = 'runs';
      this.runs.enter(pattern, base, span, this.requestBytes[die]);
    } else {
      this.kind = 'granules';
      mixNumber(mixNumber(mixNumber(copyWords(this.seedName, this.sideName), kernelIndex), die), side);
      this.granules.enter(pattern, base, span, this.sideName);
    }
  }
}
