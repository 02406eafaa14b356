import type { Separation } from '../units.js';

/**
 * The rounding guard of the JEDEC rounding algorithm (JESD79-5, from memory: times are reduced by 0.3 % of a clock's worth of
 * error before rounding up, so that a value that is whole but for rounding does not cost a clock).
 */
const GUARD = 0.003;

/** Clocks of a separation: time rounded up with the guard, or down for refresh intervals; clocks as given; the greater of both. */
export function toClocks({ ck, ps }: Separation, clockPs: number, direction: 'up' | 'down' = 'up'): number {
  const exact = ps / clockPs;
  const rounded = direction === 'up' ? Math.ceil(exact - GUARD) : Math.floor(exact + GUARD);
  return Math.max(ck, rounded);
}
