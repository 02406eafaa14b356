/**
 * One direction of a die-to-die link as a server of flits. Messages are packed into flits in the order they come; a flit that
 * has not left yet takes more, one that has left does not. An idle link starts a flit at once, so a lone message never waits
 * for company. The open die-to-die standards define the flit sizes; how messages share a flit is modelled as a byte stream.
 */
export class FlitServer {
  /** Picoseconds; when the first byte of the last message went on the link. */
  startedPs = 0;
  /** Picoseconds; when the flit with the last byte of the last message has been sent. */
  sentPs = 0;
  flits = 0;
  payloadBytes = 0;

  private lastFlitStart = Number.NEGATIVE_INFINITY; // ps, may be fractional
  private fill: number; // payload bytes used of the last flit

  constructor(
    private readonly flitPs: number, // time a flit holds the link, may be fractional
    private readonly flitPayload: number, // bytes of a flit that carry messages
  ) {
    this.fill = flitPayload;
  }

  /** Queues a message of `bytes` that is ready at `now` (ps, never earlier than the call before); see startedPs and sentPs. */
  send(now: number, bytes: number): void {
    const { flitPs, flitPayload } = this;
    if (now > this.lastFlitStart || this.fill === flitPayload) {
      const free = this.lastFlitStart + flitPs;
      this.lastFlitStart = now > free ? now : free;
      this.fill = 0;
      this.flits++;
    }
    this.startedPs = Math.ceil(this.lastFlitStart);
    const total = this.fill + bytes;
    if (total <= flitPayload) {
      this.fill = total;
    } else {
      const more = Math.ceil(total / flitPayload) - 1;
      this.lastFlitStart += more * flitPs;
      this.flits += more;
      this.fill = total - more * flitPayload;
    }
    this.payloadBytes += bytes;
    this.sentPs = Math.ceil(this.lastFlitStart + flitPs);
  }

  /** When the link is free for a new flit, ps. */
  get freePs(): number {
    return this.lastFlitStart + this.flitPs;
  }
}
