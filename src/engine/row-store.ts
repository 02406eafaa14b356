/** A ring of access-trace rows as columns. */
export class RowStore {
  count = 0;
  first = 0; // index of the oldest row
  readonly op: Uint8Array;
  readonly address: Float64Array;
  readonly bytes: Float64Array;
  readonly time: Float64Array;
  readonly flops: Float64Array;
  readonly kernel: Int32Array;
  readonly die: Int32Array;
  readonly engine: Int32Array;
  readonly tile: Int32Array;
  readonly after: Int32Array;
  readonly row: Float64Array; // number of the row, from 1
  readonly tag: Int32Array; // the holder's own note
  private readonly size: number;

  constructor(capacity: number) {
    const size = 2 ** Math.ceil(Math.log2(capacity));
    this.size = size;
    this.op = new Uint8Array(size);
    this.address = new Float64Array(size);
    this.bytes = new Float64Array(size);
    this.time = new Float64Array(size);
    this.flops = new Float64Array(size);
    this.kernel = new Int32Array(size);
    this.die = new Int32Array(size);
    this.engine = new Int32Array(size);
    this.tile = new Int32Array(size);
    this.after = new Int32Array(size);
    this.row = new Float64Array(size);
    this.tag = new Int32Array(size);
  }

  /** Appends a row and returns its index; the caller makes sure there is room. */
  add(op: number, address: number, bytes: number, kernel: number): number {
    if (this.count === this.size) throw new RangeError('row store is full');
    const at = (this.first + this.count++) & (this.size - 1);
    this.op[at] = op;
    this.address[at] = address;
    this.bytes[at] = bytes;
    this.kernel[at] = kernel;
    return at;
  }

  copyFrom(other: RowStore, from: number): number {
    const at = this.add(other.op[from], other.address[from], other.bytes[from], other.kernel[from]);
    this.time[at] = other.time[from];
    this.flops[at] = other.flops[from];
    this.tile[at] = other.tile[from];
    this.after[at] = other.after[from];
    this.row[at] = other.row[from];
    return at;
  }

  /** Drops the oldest row. */
  drop(): void {
    this.first = (this.first + 1) & (this.size - 1);
    this.count--;
  }
}
