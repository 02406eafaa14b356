/** Every rule the audit knows, with the sentence that reports print, in the order they print it. */
export const RULES = {
  tRC: 'ACT to ACT or refresh, same bank',
  tRAS: 'ACT to PRE, same bank',
  tRP: 'PRE to ACT or refresh, same bank',
  'own precharge': 'RDA or WRA to ACT or refresh, same bank: own precharge, then tRP',
  tRCDRD: 'ACT to RD, same bank',
  tRCDWR: 'ACT to WR, same bank',
  tRTP: 'RD to PRE, same bank',
  tWR: 'WR to PRE, same bank: WL + burst + tWR',
  tRRD_L: 'ACT to ACT, same bank group',
  tRRD_S: 'ACT to ACT, other bank group',
  tFAW: 'ACT to the fourth ACT after it',
  tCCD_L: 'column to column command, same bank group',
  tCCD_S: 'column to column command, other bank group',
  tCCD_R: 'column to column command, other stack ID',
  tRTW: 'RD to WR: RL + burst - WL + tRTW',
  tWTR_L: 'WR to RD, same bank group: WL + burst + tWTR_L',
  tWTR_S: 'WR to RD, other bank group: WL + burst + tWTR_S',
  tPPD: 'PRE to PRE, same pseudo-channel',
  tRFCab: 'all-bank refresh to any command in its scope',
  tRFCpb: 'per-bank refresh to any command to its bank',
  tRREFD: 'per-bank refresh to the next, or to ACT of another bank',
  'refresh gap': 'refresh to refresh, at most (postpone + 1) x tREFI',
  'refresh owed': 'the nth refresh, at the latest at (n + postpone) x tREFI',
  'refresh ahead': 'the nth refresh, at the soonest at (n - 1 - pull-in) x tREFI',
  'refresh order': 'every bank of a stack ID refreshed once before any twice',
  'open row': 'ACT or refresh of a bank with an open row',
  'no open row': 'column command to a bank without an open row',
  'other row': 'column command to another row than the open one',
  'row bus': 'one row command at a time, per channel',
  'column bus': 'one column command at a time, per channel',
  'command bus': 'one command at a time, per channel',
  'data bus': 'one burst at a time, per pseudo-channel',
  'clock edge': 'column command on a half clock',
  'time order': 'commands of a channel in order of time',
  'address range': 'stack, channel, bank, row and column within the device',
} as const;

export type RuleName = keyof typeof RULES;
export const RULE_NAMES = Object.keys(RULES) as readonly RuleName[];

/** A rule's number: its index in RULE_NAMES. */
export const ruleNumber = (name: RuleName): number => RULE_NAMES.indexOf(name);
