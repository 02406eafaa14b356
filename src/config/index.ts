/**
 * config: what the user wrote, understood.
 *
 * In: package files (YAML with units), device presets, overrides. Out: a frozen Package in ps, ck and bytes.
 * Its one decision: check, then normalise, then a strict type with nothing optional; every value can be traced to the file and
 * line it came from (tree.ts), so errors always have a place. One definition (schema.ts) validates, types and documents.
 * Not modelled here: anything that moves. What follows from a package without running it is in derive.ts and describe.ts.
 */
export * from './derive.js';
export * from './describe.js';
export { DEVICES } from './devices/index.js';
export { domains } from './domains.js';
export { loadPackage, parsePackage } from './load.js';
export * from './package.js';
export { packageJsonSchema } from './schema.js';
