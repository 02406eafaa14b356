import { hbm2 } from './hbm2.js';
import { hbm3 } from './hbm3.js';
import type { DevicePreset } from './preset.js';

/** Every device a package file can name. A new one is a file beside these and a line here. */
export const DEVICES: ReadonlyMap<string, DevicePreset> = new Map([hbm2, hbm3].map((device) => [device.name, device]));

export type { DevicePreset, Sourced } from './preset.js';
