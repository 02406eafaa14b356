/** The commands of a log, by their JEDEC names; a command's number is its index here. */
export const COMMANDS = ['ACT', 'RD', 'RDA', 'WR', 'WRA', 'PRE', 'PREA', 'REFab', 'REFpb', 'RFMab', 'RFMpb'] as const;
export type CommandName = (typeof COMMANDS)[number];

/**
 * What the rules tell apart. A command with own precharge is a column command and, later, an OWN: the moment its bank begins to
 * precharge. Refresh management (RFM) closes a bank as a refresh does.
 */
export const KINDS = ['ACT', 'RD', 'WR', 'PRE', 'OWN', 'REFab', 'REFpb'] as const;
export type Kind = (typeof KINDS)[number];
export const KIND_COUNT = KINDS.length;

const kind = (name: Kind): number => KINDS.indexOf(name);
export const ACT = kind('ACT');
export const RD = kind('RD');
export const WR = kind('WR');
export const PRE = kind('PRE');
export const OWN = kind('OWN');
export const REFAB = kind('REFab');
export const REFPB = kind('REFpb');

const KIND_NAMES: Readonly<Record<CommandName, Kind>> = {
  ACT: 'ACT',
  RD: 'RD',
  RDA: 'RD',
  WR: 'WR',
  WRA: 'WR',
  PRE: 'PRE',
  PREA: 'PRE',
  REFab: 'REFab',
  REFpb: 'REFpb',
  RFMab: 'REFab',
  RFMpb: 'REFpb',
};

/** Kind of each command, by number. */
export const KIND_OF = Uint8Array.from(COMMANDS, (name) => KINDS.indexOf(KIND_NAMES[name]));

const flags = (...names: readonly CommandName[]): Uint8Array =>
  Uint8Array.from(COMMANDS, (name) => (names.includes(name) ? 1 : 0));

export const OWN_PRECHARGE = flags('RDA', 'WRA'); // closes its row by itself
export const IS_REFRESH = flags('REFab', 'REFpb'); // pays a refresh that is due; RFM does not
export const MANY_BANKS = flags('PREA', 'REFab', 'RFMab'); // goes to every bank of a stack ID or a pseudo-channel
export const NEEDS_ROW = flags('ACT');
export const NEEDS_COLUMN = flags('RD', 'RDA', 'WR', 'WRA');
