import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors.js';
import { parsePattern } from '../../src/trace/index.js';

const where = { file: 't.csv', line: 3, path: 'read_pattern' };
const refusal = (text: string) => {
  try {
    parsePattern(text, where);
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    return error as InputError;
  }
  throw new Error(`'${text}' was accepted`);
};
const NONE = { granule: 0, span: 0, stride: 0, s: 0, rows: 0, width: 0, pitch: 0 };

describe('pattern text', () => {
  it.each([
    ['sequential', { name: 'sequential' }],
    ['strided stride=4KiB', { name: 'strided', stride: 4096 }],
    ['strided stride=4KiB granule=64B span=1MiB', { name: 'strided', stride: 4096, granule: 64, span: 2 ** 20 }],
    ['uniform granule=64B span=2GiB', { name: 'uniform', granule: 64, span: 2 ** 31 }],
    ['uniform', { name: 'uniform', granule: 64 }],
    ['zipf s=1.1 granule=256B span=8GiB', { name: 'zipf', s: 1.1, granule: 256, span: 2 ** 33 }],
    ['zipf', { name: 'zipf', s: 1, granule: 64 }],
    ['chase granule=64B span=1GiB', { name: 'chase', granule: 64, span: 2 ** 30 }],
    ['  block   rows=128 width=256B  pitch=16KiB ', { name: 'block', rows: 128, width: 256, pitch: 16384 }],
  ])('reads %s', (text, expected) => {
    expect(parsePattern(text, where)).toEqual({ ...NONE, ...expected, text: text.trim() });
  });

  it.each([
    ['', 'an empty pattern', ''],
    ['seqential', "unknown pattern 'seqential'", "did you mean 'sequential'?"],
    ['strided', "pattern 'strided' without 'stride'", "for example 'strided stride=4KiB'"],
    ['strided strid=4KiB', "parameter 'strid' of pattern 'strided'", "did you mean 'stride'?"],
    ['sequential span=1MiB', "parameter 'span' of pattern 'sequential'", ''],
    ['uniform constructor=1B', "parameter 'constructor' of pattern 'uniform'", ''],
    ['uniform granule', "'granule' after 'uniform'", ''],
    ['uniform granule= 64B', "'granule=' after 'uniform'", ''],
    ['uniform granule=64B granule=32B', "parameter 'granule' twice", ''],
    ['zipf s=0', 's=0', ''],
    ['zipf s=-1', 's=-1', ''],
    ['zipf s=x', 's=x', ''],
    ['block rows=0 width=1B pitch=1B', 'rows=0', ''],
    ['block rows=1.5 width=1B pitch=1B', 'rows=1.5', ''],
    ['block rows=1 width=64B pitch=32B', 'a width of 64 B and a pitch of 32 B', ''],
    ['strided stride=64B granule=128B', 'a granule of 128 B and a stride of 64 B', ''],
    ['strided stride=64B span=32B', 'a span of 32 B and a stride of 64 B', ''],
    ['uniform granule=64B span=32B', 'a span of 32 B and a granule of 64 B', ''],
  ])('refuses %j', (text, found, hint) => {
    const error = refusal(text);
    expect(error.found).toBe(found);
    expect(error.where).toMatchObject({ file: 't.csv', line: 3 });
    if (hint !== '') expect(error.hint).toBe(hint);
  });

  it.each([
    'uniform granule=0B',
    'uniform granule=64',
    'uniform granule=2GiB',
    'uniform granule=64ns',
    'strided stride=0B',
  ])('refuses the size in %j and names its parameter', (text) => {
    expect(refusal(text).where.path).toMatch(/^read_pattern\.(granule|stride)$/);
  });
});
