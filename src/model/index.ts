/**
 * model: what exists and its rules.
 *
 * In: a Package. Out: counts (system.ts), command separations in half clocks (separations.ts), the map between addresses and
 * places (address-map.ts), and how long flits hold a link (flit-server.ts).
 * Its one decision: no clock and no queue. Everything here is a calculator that can be tested alone; the engine puts it in order.
 * Not modelled here: what happens when (engine), and what a user may write (config).
 */
export { AddressMap } from './address-map.js';
export { FlitServer } from './flit-server.js';
export { type Separations, separationsOf } from './separations.js';
export { memoryOf, type System, systemOf } from './system.js';
