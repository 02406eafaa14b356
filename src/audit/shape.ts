import type { Organisation } from '../config/package.js';
import { COMMANDS, type CommandName } from './commands.js';

/** A command of the log as reports name it; what the command does not use is null. */
export interface LoggedCommand {
  readonly ck: number; // may end in .5
  readonly stack: number;
  readonly channel: number;
  readonly pseudo_channel: number;
  readonly sid: number | null;
  readonly bank_group: number | null;
  readonly bank: number | null; // within its group
  readonly row: number | null; // of the later command only
  readonly column: number | null; // of the later command only
  readonly command: CommandName;
  readonly line: number; // of the log
}

/** How places are numbered: pseudo-channel p of the package, then bank groups and banks of p over all its stack IDs. */
export class Shape {
  readonly channels: number; // of the package
  readonly pseudoChannels: number; // of the package
  readonly sids: number; // of a pseudo-channel
  readonly groups: number; // of a pseudo-channel, over its stack IDs
  readonly banks: number; // of a pseudo-channel, over its stack IDs
  readonly banksPerSid: number;
  private readonly places: number; // of a pseudo-channel: each bank, each stack ID, the whole

  constructor(readonly organisation: Organisation) {
    const o = organisation;
    this.channels = o.stacks * o.channels;
    this.pseudoChannels = this.channels * o.pseudo_channels;
    this.sids = o.sids;
    this.groups = o.sids * o.bank_groups;
    this.banksPerSid = o.bank_groups * o.banks_per_group;
    this.banks = o.sids * this.banksPerSid;
    this.places = this.banks + this.sids + 1;
  }

  /** Packs a command, its pseudo-channel within the channel, and its bank (or only stack ID, or neither: -1). */
  what(command: number, pc: number, sid: number, bank: number): number {
    const place = bank >= 0 ? bank : this.banks + (sid >= 0 ? sid : this.sids);
    return (pc * this.places + place) * COMMANDS.length + command;
  }

  /** Undoes `what`, for a command of channel `channel` of the package. */
  unpack(what: number, channel: number, issued: number, line: number): LoggedCommand {
    const { channels, bank_groups, banks_per_group } = this.organisation;
    const at = Math.floor(what / COMMANDS.length);
    const place = at % this.places;
    const bank = place < this.banks ? place : -1;
    const sid = bank >= 0 ? Math.floor(bank / this.banksPerSid) : place - this.banks;
    return {
      ck: issued / 2,
      stack: Math.floor(channel / channels),
      channel: channel % channels,
      pseudo_channel: Math.floor(at / this.places),
      sid: sid < this.sids ? sid : null,
      bank_group: bank < 0 ? null : Math.floor(bank / banks_per_group) % bank_groups,
      bank: bank < 0 ? null : bank % banks_per_group,
      row: null,
      column: null,
      command: COMMANDS[what % COMMANDS.length],
      line,
    };
  }

  /** Channel of the package that pseudo-channel p belongs to. */
  channelOf(p: number): number {
    return Math.floor(p / this.organisation.pseudo_channels);
  }

  /** Words for pseudo-channel p, or one of its stack IDs, or one of its banks (numbered over its stack IDs). */
  placeName(p: number, sid: number, bank: number): string {
    const { channels, pseudo_channels, bank_groups, banks_per_group } = this.organisation;
    const channel = this.channelOf(p);
    let text = `stack ${Math.floor(channel / channels)} channel ${channel % channels} pseudo-channel ${p % pseudo_channels}`;
    if (sid >= 0) text += ` sid ${sid}`;
    if (bank >= 0) text += ` group ${Math.floor(bank / banks_per_group) % bank_groups} bank ${bank % banks_per_group}`;
    return text;
  }
}
