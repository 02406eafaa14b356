/**
 * The command log: every DRAM command as a CSV row, written while the engine runs. Millions of rows a second are plausible, so
 * rows are put together as bytes in one fixed buffer, and no string is made for any of them.
 */
import type { Package } from '../config/package.js';
import { COMMANDS, type CommandSink } from '../engine/index.js';
import { OutputFile } from './output.js';

export const LOG_HEADER = 'ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,request\n';

const BUFFER_BYTES = 1 << 18;
const LONGEST_ROW = 256; // ten numbers of at most 16 digits, separators and the longest command name
const [COMMA, NEWLINE, POINT, FIVE, ZERO] = [...Buffer.from(',\n.50')];

/** Opens a log for the commands of `pkg`. Nothing stands under the file's own name until `finish`. */
export class CommandLog {
  private readonly output: OutputFile;
  private readonly buffer = Buffer.alloc(BUFFER_BYTES);
  private used = 0;
  private readonly places: Buffer[] = []; // by pseudo-channel index p: ',stack,channel,pseudo_channel,'
  private readonly commands = COMMANDS.map((name) => Buffer.from(`${name},`));

  constructor(file: string, pkg: Package) {
    const { stacks, channels, pseudo_channels } = pkg.memory[0].organisation;
    for (let stack = 0; stack < stacks; stack++)
      for (let channel = 0; channel < channels; channel++)
        for (let pc = 0; pc < pseudo_channels; pc++) this.places.push(Buffer.from(`,${stack},${channel},${pc},`));
    this.output = new OutputFile(file, 'commandLog');
    this.used = this.buffer.write(LOG_HEADER);
  }

  /** Takes one command. Throws SystemError when the disk will not take any more. */
  readonly sink: CommandSink = (halfCk, p, sid, bankGroup, bank, row, column, command, request) => {
    if (this.used + LONGEST_ROW > BUFFER_BYTES) this.flush();
    const { buffer } = this;
    let at = putNumber(buffer, this.used, Math.floor(halfCk / 2));
    if (halfCk % 2 !== 0) {
      buffer[at++] = POINT;
      buffer[at++] = FIVE;
    }
    at = putBytes(buffer, at, this.places[p]);
    at = putField(buffer, at, sid);
    at = putField(buffer, at, bankGroup);
    at = putField(buffer, at, bank);
    at = putField(buffer, at, row);
    at = putField(buffer, at, column);
    at = putBytes(buffer, at, this.commands[command]);
    if (request >= 0) at = putNumber(buffer, at, request);
    buffer[at++] = NEWLINE;
    this.used = at;
  };

  /** Writes what is left and puts the file in its place. */
  finish(): void {
    this.flush();
    this.output.commit();
  }

  private flush(): void {
    this.output.write(this.buffer.subarray(0, this.used));
    this.used = 0;
  }
}

/** A number and a comma; only the comma where the command has no such field (-1). */
function putField(buffer: Buffer, at: number, value: number): number {
  const end = value < 0 ? at : putNumber(buffer, at, value);
  buffer[end] = COMMA;
  return end + 1;
}

function putBytes(buffer: Buffer, at: number, bytes: Buffer): number {
  for (let i = 0; i < bytes.length; i++) buffer[at + i] = bytes[i];
  return at + bytes.length;
}

/** The decimal digits of a whole number from 0 to 2^53. Returns where the next byte goes. */
function putNumber(buffer: Buffer, at: number, value: number): number {
  let end = at + 1;
  for (let limit = 10; value >= limit; limit *= 10) end++;
  let rest = value;
  for (let i = end - 1; i >= at; i--) {
    const next = Math.floor(rest / 10);
    buffer[i] = ZERO + (rest - 10 * next);
    rest = next;
  }
  return end;
}
