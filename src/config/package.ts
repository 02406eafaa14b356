/**
 * The resolved package: what `config` hands to everything on its right. Strict and frozen: nothing optional, no strings with
 * units left. Times are picoseconds (`…Ps`, may be fractional only for clock periods and flit times), DRAM separations are
 * whole DRAM clocks (ck), sizes are bytes, rates are per second.
 */

/** The JEDEC separations every device preset gives, in the order reports print them. */
export const TIMING_NAMES = [
  'tRC',
  'tRAS',
  'tRP',
  'tRCDRD',
  'tRCDWR',
  'tRRD_S',
  'tRRD_L',
  'tFAW',
  'tRTP',
  'tWR',
  'tWTR_S',
  'tWTR_L',
  'tCCD_S',
  'tCCD_L',
  'tCCD_R',
  'tPPD',
  'tRTW',
  'tRFCab',
  'tRFCpb',
  'tREFI',
  'tRREFD',
  'RL',
  'WL',
] as const;
export type TimingName = (typeof TIMING_NAMES)[number];

/** One separation as resolved; tRTW is the bus turnaround bubble added to RL + burst - WL, tPPD is 0 where the device has none. */
export interface Timing {
  readonly ck: number; // whole DRAM clocks
  readonly ns: number; // what those clocks last, or the value as given
  readonly source: string; // where the value comes from, in words
}

export interface Organisation {
  readonly stacks: number; // stacks in this memory group
  readonly channels: number; // per stack
  readonly pseudo_channels: number; // per channel
  readonly sids: number; // stack IDs (ranks) per pseudo-channel
  readonly bank_groups: number; // per stack ID
  readonly banks_per_group: number;
  readonly rows: number; // per bank
  readonly columns: number; // atoms per row: one column here is one access of `atom_bytes`
  readonly burst_ck: number; // clocks one atom holds the data bus
  readonly atom_bytes: number; // access granularity
}

/** Clocks a command holds its command bus, in half clocks, because a row bus may carry a command of 1.5 ck. */
export interface CommandBuses {
  readonly separate: boolean; // true: row and column commands have a bus each (HBM); false: one bus
  readonly actHalfCk: number;
  readonly preHalfCk: number;
  readonly refHalfCk: number;
  readonly columnHalfCk: number;
}

export interface Refresh {
  readonly mode: 'all-bank' | 'per-bank' | 'off';
  readonly scope: 'pseudo_channel' | 'sid'; // what one REFab closes
  readonly postpone: number; // 1 or more: refreshes of a bank that may be owed at once; the gap never exceeds (postpone + 1) x tREFI
  readonly pullIn: number; // refreshes that may be done ahead while idle
  readonly temperatureC: number; // tREFI already halved above 85
  readonly refpbInActivateWindow: boolean; // per-bank refreshes count in tRRD and tFAW
}

export interface Controller {
  readonly readQueue: number; // entries per pseudo-channel
  readonly writeQueue: number; // entries per pseudo-channel
  readonly scheduler: 'fcfs' | 'fr-fcfs';
  readonly hitCap: number; // column commands a row may serve since ACT while an older conflict waits
  readonly ageBoundCk: number; // an entry older than this goes first
  readonly page: 'open' | 'closed' | 'timeout';
  readonly pageTimeoutCk: number; // clocks without a hit before a row is closed (page: timeout)
  readonly drainHigh: number; // write entries at which draining starts
  readonly drainLow: number; // write entries at which draining ends
  readonly pipelineCk: number; // clocks from arrival to the answer of a forwarded read or a write acknowledgement
}

export interface BaseDie {
  readonly ingressPs: number; // link receiver to controller queue
  readonly egressPs: number; // DRAM data to link transmitter
}

/** One kind of memory; its stacks are numbered on from those of the groups before it. */
export interface MemoryGroup {
  readonly name: string;
  readonly device: string; // preset name
  readonly clockPs: number; // DRAM clock period; may be fractional
  readonly peakBytesPerS: number; // of one stack
  readonly organisation: Organisation;
  readonly timings: Readonly<Record<TimingName, Timing>>;
  readonly activateWindowScope: 'pseudo_channel' | 'sid'; // where tFAW and tRRD hold
  readonly buses: CommandBuses;
  readonly refresh: Refresh;
  readonly controller: Controller;
  readonly baseDie: BaseDie;
  readonly notes: readonly string[]; // what the preset knows and what is representative
}

export interface ComputeDie {
  readonly name: string;
  readonly clockPs: number; // may be fractional
  readonly engines: number; // independent in-order issue streams
  readonly window: number; // outstanding requests per engine
  readonly issuePerClock: number; // requests per engine and clock
  readonly buffering: number; // tiles whose loads may be outstanding or waiting while an earlier one computes, itself included
  readonly requestBytes: number; // longest request an engine sends
  readonly peakFlops: Readonly<Record<string, number>>; // FLOP/s of the whole die per number format
  readonly edgeMm: number; // 0: not given
}

/** A full-duplex die-to-die link between a compute die and a stack; each direction is a server of its own. */
export interface Link {
  readonly name: string;
  readonly entry: number; // index in the package file's list, where one entry may make several links
  readonly die: number; // index into dies
  readonly stack: number; // global stack number; every stack has exactly one link
  readonly lanes: number; // per direction
  readonly transfersPerS: number; // per lane
  readonly flitBytes: number;
  readonly flitOverheadBytes: number;
  readonly flitPs: number; // time one flit holds the link
  readonly requestHeaderBytes: number; // read request, and header of a write
  readonly responseHeaderBytes: number; // header of read data
  readonly ackBytes: number; // write acknowledgement
  readonly latencyPs: number; // one way, after serialisation
  readonly landingBytes: number; // receiver and egress buffer read data may land in
  readonly rawBytesPerS: number; // one direction
  readonly payloadBytesPerS: number; // raw x (flit - overhead) / flit
}

export type FieldName = 'column' | 'bank_group' | 'bank' | 'sid' | 'row' | 'pseudo_channel';
export type InterleaveUnit = 'stack' | 'channel' | 'pseudo_channel';

export interface AddressMap {
  readonly granuleBytes: number; // bytes that stay together before the next unit
  readonly interleave: readonly InterleaveUnit[]; // fastest first; always contains stack and channel
  readonly rotate: boolean; // each round over the units begins at another one, by a hash of its number
  /** Bit fields of the address inside an interleave unit, lowest first, above the atom's byte bits. A name may return. */
  readonly fields: readonly { readonly name: FieldName; readonly bits: number }[];
  /** Output bit `bit` of `target` is XORed with the parity of these row bits. */
  readonly xor: readonly {
    readonly target: 'bank_group' | 'bank' | 'sid' | 'channel' | 'pseudo_channel';
    readonly bit: number;
    readonly rowBits: readonly number[];
  }[];
}

export interface Package {
  readonly name: string;
  readonly file: string; // as the user gave it
  readonly hash: string; // sha256 of the resolved package, hex
  readonly caution: string; // the invented-data or planning note the file carries, may be ''
  readonly dies: readonly ComputeDie[];
  readonly memory: readonly MemoryGroup[]; // exactly one group for now
  readonly links: readonly Link[]; // sorted by stack: links[s].stack === s
  readonly addressMap: AddressMap;
}

/**
 * Addresses: each compute die owns the stacks its links reach; die d's memory is one contiguous range of the global address
 * space, in die order. Inside the range the map interleaves over that die's stacks only.
 */
export interface Domain {
  readonly die: number;
  readonly base: number; // first address, bytes
  readonly capacity: number; // bytes
  readonly stacks: readonly number[]; // global stack numbers, ascending
}
