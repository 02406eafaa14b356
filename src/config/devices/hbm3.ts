import type { DevicePreset } from './preset.js';

const JESD238 = 'JESD238, through a cross-standard digest';
const HBM2_TABLE = "timing table for HBM2 in O'Connor et al., MICRO 2017, from memory; taken as representative";
const MEMORY = 'from memory, representative';

/**
 * HBM3 at 6.4 Gb/s a pin, eight dies high, 16 Gb a die: 16 channels of two 32-bit pseudo-channels, 819.2 GB/s and 16 GiB a
 * stack. A channel is then 8 Gb: 512 MiB a pseudo-channel = 2 stack IDs x 16 banks x 16,384 rows x 1 KiB.
 */
export const hbm3: DevicePreset = {
  name: 'hbm3-6.4',
  title: 'HBM3, 6.4 Gb/s a pin, 8-high, 16 GiB',
  notes: [
    'Organisation, command lengths, column separations and refresh rules follow JESD238 as read in a cross-standard digest.',
    'Row timings are representative: JESD238 leaves them to the vendor. Replace them with the data sheet before sign-off.',
  ],
  clock: { value: '1.6 GHz', source: `${JESD238}: CK is a quarter of the data rate` },
  organisation: {
    channels: { value: 16, source: JESD238 },
    pseudo_channels: { value: 2, source: JESD238 },
    sids: { value: 2, source: `${JESD238} (table 30 allows 1 to 4): 8-high` },
    bank_groups: { value: 4, source: `${JESD238}: BA[3:0] as four groups of four` },
    banks_per_group: { value: 4, source: `${JESD238}: BA[3:0] as four groups of four` },
    rows: { value: 16384, source: 'derived: 512 MiB / (2 x 16 banks) / 1 KiB' },
    columns: { value: 32, source: `${JESD238}: page of 1 KiB a pseudo-channel / 32 B` },
    burst_ck: { value: 2, source: `${JESD238}: BL8 at four bits a clock` },
    atom_bytes: { value: 32, source: `${JESD238}: BL8 x 32 bit` },
  },
  timings: {
    tRC: { value: '45 ns', source: HBM2_TABLE },
    tRAS: { value: '29 ns', source: HBM2_TABLE },
    tRP: { value: '16 ns', source: HBM2_TABLE },
    tRCDRD: { value: '16 ns', source: HBM2_TABLE },
    tRCDWR: {
      value: '12 ns',
      source: 'tRCDRD x 14.3/19.0, the ratio of JESD270-4 (HBM4), through a cross-standard digest',
    },
    tRRD_S: { value: '4 ck', source: `${HBM2_TABLE} (2 to 4 ck)` },
    tRRD_L: { value: '6 ck', source: MEMORY },
    tFAW: { value: '16 ns', source: HBM2_TABLE },
    tRTP: { value: '5 ns', source: MEMORY },
    tWR: { value: '16 ns', source: MEMORY },
    tWTR_S: { value: '3 ns', source: HBM2_TABLE },
    tWTR_L: { value: '8 ns', source: HBM2_TABLE },
    tCCD_S: { value: '2 ck', source: `${JESD238} table 93` },
    tCCD_L: { value: 'max(4 ck, 2.5 ns)', source: `${JESD238} table 93` },
    tCCD_R: { value: '3 ck', source: `${JESD238} table 93 has it apart; value from memory` },
    tPPD: { value: '2 ck', source: MEMORY },
    tRTW: { value: '2 ck', source: MEMORY },
    tRFCab: {
      value: '350 ns',
      source: 'JESD238 table 84 for 8 Gb a channel (260 / 350 / 450 ns for 4 / 8 / 16 Gb), from memory',
    },
    tRFCpb: { value: '200 ns', source: MEMORY },
    tREFI: { value: '3.9 us', source: 'JESD238 table 84, from memory' },
    tRREFD: { value: '8 ns', source: MEMORY },
    RL: { value: '16 ns', source: `${HBM2_TABLE} (tCL)` },
    WL: { value: '10 ck', source: MEMORY },
  },
  buses: {
    value: { separate: true, actHalfCk: 3, preHalfCk: 1, refHalfCk: 1, columnHalfCk: 2 },
    source: `${JESD238} section 3.1.3, tables 30 to 32: ACT 1.5 ck, other row commands 0.5 ck, column commands 1 ck`,
  },
  activateWindowScope: { value: 'pseudo_channel', source: 'from memory; the stricter reading' },
  refreshScope: { value: 'pseudo_channel', source: `${JESD238}: after REFab only RNOP and CNOP until tRFCab` },
  postpone: { value: 8, source: `${JESD238} section 6.3.2.5 note 2: at most 9 x tREFI between two REF` },
  pullIn: { value: 8, source: `${JESD238} section 6.3.2.5 note 2, read as for postponing` },
  refpbInActivateWindow: { value: true, source: `${JESD238} note 1: REFpb counts in tRRD and tFAW` },
};
