/**
 * What the page's charts draw: plain numbers, made by the report so that the page's own program only draws. Names are text,
 * not markup. Nothing is imported here: the page's program is checked against this file without the rest.
 */
export interface PageData {
  /** Classes of the bandwidth stack that got any clock, in the stack's order. */
  readonly classes: readonly { readonly key: string; readonly label: string }[];
  readonly kernelStacks: KernelStacks;
  readonly time: TimeData;
  readonly delays: DelayData;
  readonly roofline: RooflineData;
  readonly banks: BankData;
}

export interface KernelStacks {
  readonly names: readonly string[];
  readonly shares: readonly (readonly number[])[]; // shares[kernel][class of PageData.classes], 0 … 1
}

export interface TimeData {
  readonly slicePs: number; // of the bandwidth
  readonly read: readonly number[]; // bytes a second by slice
  readonly write: readonly number[];
  readonly bound: number; // bytes a second
  readonly stackSlicePs: number; // of the shares
  readonly shares: readonly (readonly number[])[]; // shares[class of PageData.classes][slice], 0 … 1
  readonly kernels: readonly { readonly name: string; readonly startPs: number; readonly endPs: number }[];
  readonly lanes: readonly number[]; // lane of each kernel: kernels of one lane do not overlap
  readonly endPs: number;
}

export interface DelayData {
  readonly fromPs: readonly number[]; // delays, rising
  /** beyond[i]: share of the reads whose delay is fromPs[i] or more; 'read latency' first, then the stages. */
  readonly series: readonly { readonly label: string; readonly beyond: readonly number[] }[];
}

export interface BankData {
  readonly rows: readonly string[]; // pseudo-channels: stack.channel.pseudo-channel
  readonly columns: readonly string[]; // banks: stack ID.bank group.bank
  readonly atomBytes: number;
  readonly metrics: readonly { readonly key: string; readonly label: string; readonly values: readonly number[] }[]; // row after row
}

/** The roofline plot: kernels with flops as points over FLOP per moved byte, and the ceilings of the whole package. */
export interface RooflineData {
  readonly points: readonly RooflinePoint[];
  readonly slopes: readonly { readonly label: string; readonly bytesPerS: number }[]; // ceilings of bandwidth
  readonly roofs: readonly { readonly label: string; readonly flopsPerS: number }[]; // ceilings by number format
  /** Every kernel that moved or computed anything, against its bound. */
  readonly reached: readonly { readonly name: string; readonly ratio: number; readonly estimate: number | null }[];
}

export interface RooflinePoint {
  readonly name: string;
  readonly intensity: number; // FLOP per moved byte
  readonly attained: number; // FLOP/s
  readonly bound: number;
  readonly estimate: number | null; // FLOP/s if the trace's own estimate of the time held
  readonly by: string; // which ceiling its bound is
}
