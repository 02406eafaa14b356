import {
  formatBandwidth,
  formatBytes,
  formatCount,
  formatFlops,
  formatPercent,
  formatTime,
  type QuantityKind,
} from '../units.js';

/** A value in the base unit of its kind, for people; a share in per cent. */
export function showQuantity(value: number, kind: QuantityKind, share = false): string {
  if (share) return formatPercent(value);
  switch (kind) {
    case 'time':
      return formatTime(value);
    case 'size':
      return formatBytes(value);
    case 'bandwidth':
      return formatBandwidth(value);
    case 'compute rate':
      return formatFlops(value);
    case 'energy per bit':
      return `${formatCount(value)} pJ/bit`;
    case 'energy':
      return value >= 1e9 ? `${formatCount(value / 1e9)} mJ` : `${formatCount(value / 1e3)} nJ`;
    case 'power':
      return `${formatCount(value)} W`;
    case 'length':
      return `${formatCount(value)} mm`;
    default:
      return formatCount(value);
  }
}
