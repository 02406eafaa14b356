/** Access batches to CSV text, in the form `openTrace` reads. Writing the text to a file is the caller's work. */
import { type AccessBatch, READ } from './batch.js';

/**
 * Gives the text of an access trace in pieces, the header row first. Columns the batches have not are left out, and so is the
 * kernel's name when `kernelNames` is null. Dies and engines are written as numbers, times in ps, addresses in hexadecimal.
 */
export async function* accessCsv(
  batches: AsyncIterable<AccessBatch> | Iterable<AccessBatch>,
  kernelNames: readonly string[] | null,
): AsyncGenerator<string> {
  let header = '';
  for await (const batch of batches) {
    const { count, op, address, bytes, timePs, die, engine, kernel, tile, flops, after } = batch;
    if (header === '') {
      header = 'op,address,bytes';
      if (timePs !== null) header += ',time_ps';
      if (die !== null) header += ',die';
      if (engine !== null) header += ',engine';
      if (kernelNames !== null) header += ',kernel';
      if (tile !== null) header += ',tile';
      if (flops !== null) header += ',flops';
      if (after !== null) header += ',after';
      yield `${header}\n`;
    }
    let text = '';
    for (let i = 0; i < count; i++) {
      text += `${op[i] === READ ? 'R' : 'W'},0x${address[i].toString(16)},${bytes[i]}`;
      if (timePs !== null) text += `,${timePs[i]}`;
      if (die !== null) text += die[i] < 0 ? ',' : `,${die[i]}`;
      if (engine !== null) text += engine[i] < 0 ? ',' : `,${engine[i]}`;
      if (kernelNames !== null) text += `,${quoted(kernelNames[kernel[i]])}`;
      if (tile !== null) text += `,${tile[i]}`;
      if (flops !== null) text += `,${flops[i]}`;
      if (after !== null) text += `,${after[i]}`;
      text += '\n';
    }
    yield text;
  }
}

/** A cell in quotes when it needs them (RFC 4180). */
function quoted(cell: string): string {
  return /[",\r\n]/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell;
}
