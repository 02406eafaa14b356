import type { DevicePreset } from './preset.js';

const FCCM = 'derived from the measurements of Wang, Huang, Zhang and Alonso, FCCM 2020';
const GUIDE = 'public user guides of FPGAs with HBM2';
const TABLE = "timing table for HBM2 in O'Connor et al., MICRO 2017, from memory";
const MEMORY = 'from memory, representative';

/**
 * HBM2 at 1.8 Gb/s a pin as on a measured FPGA card: 8 channels of two 64-bit pseudo-channels of 14.4 GB/s, four dies high,
 * 4 GiB a stack. 256 MiB a pseudo-channel = 16 banks x 16,384 rows x 1 KiB.
 */
export const hbm2: DevicePreset = {
  name: 'hbm2-1.8',
  title: 'HBM2, 1.8 Gb/s a pin, 4-high, 4 GiB',
  notes: [
    'tRCD, tRP, tRC and tCCD_L are read off published measurements at 450 MHz granularity; other row timings are representative.',
  ],
  clock: { value: '900 MHz', source: 'FCCM 2020: memory clock of the measured card' },
  organisation: {
    channels: { value: 8, source: GUIDE },
    pseudo_channels: { value: 2, source: GUIDE },
    sids: { value: 1, source: `${GUIDE}: 4-high` },
    bank_groups: { value: 4, source: GUIDE },
    banks_per_group: { value: 4, source: GUIDE },
    rows: { value: 16384, source: `${GUIDE}: RA[13:0]` },
    columns: { value: 32, source: `${GUIDE}: CA[5:1], 1 KiB a pseudo-channel / 32 B` },
    burst_ck: { value: 2, source: `${GUIDE}: BL4 at two bits a clock` },
    atom_bytes: { value: 32, source: `${GUIDE}: BL4 x 64 bit` },
  },
  timings: {
    tRC: {
      value: '44 ck',
      source: `${FCCM}: four banks of a group at 13.33 ns a request, less the share of refresh, about 8 % (an interpretation)`,
    },
    tRAS: { value: '30 ck', source: 'tRC - tRP' },
    tRP: { value: '14 ck', source: `${FCCM}: miss less closed, 15.6 ns` },
    tRCDRD: { value: '14 ck', source: `${FCCM}: closed less hit, 15.6 ns` },
    tRCDWR: { value: '14 ck', source: 'as tRCDRD, from memory' },
    tRRD_S: { value: '4 ck', source: TABLE },
    tRRD_L: { value: '6 ck', source: MEMORY },
    tFAW: { value: '16 ns', source: TABLE },
    tRTP: { value: '5 ns', source: MEMORY },
    tWR: { value: '16 ns', source: MEMORY },
    tWTR_S: { value: '3 ns', source: TABLE },
    tWTR_L: { value: '8 ns', source: TABLE },
    tCCD_S: { value: '2 ck', source: `${GUIDE}: one BL4` },
    tCCD_L: { value: '4 ck', source: `${FCCM}: 6.7 against 13.27 GB/s` },
    tCCD_R: { value: '3 ck', source: MEMORY },
    tPPD: { value: '0 ck', source: MEMORY },
    tRTW: { value: '2 ck', source: MEMORY },
    tRFCab: { value: '260 ns', source: 'from memory, 4 Gb a channel' },
    tRFCpb: { value: '160 ns', source: MEMORY },
    tREFI: { value: '3.9 us', source: 'from memory' },
    tRREFD: { value: '8 ns', source: MEMORY },
    RL: { value: '16 ns', source: `${TABLE} (tCL)` },
    WL: { value: '6 ck', source: MEMORY },
  },
  buses: {
    value: { separate: true, actHalfCk: 4, preHalfCk: 2, refHalfCk: 2, columnHalfCk: 2 },
    source: 'from memory: ACT two clocks, other commands one',
  },
  activateWindowScope: { value: 'pseudo_channel', source: MEMORY },
  refreshScope: { value: 'pseudo_channel', source: MEMORY },
  postpone: { value: 8, source: 'from memory: at most 9 x tREFI between two REF' },
  pullIn: { value: 8, source: 'from memory' },
  refpbInActivateWindow: { value: true, source: 'from memory, as HBM3' },
};
