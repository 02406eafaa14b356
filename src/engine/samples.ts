import { type Collector, type SampleBlock, STAGES } from './recording.js';

const ROWS = 4096;

/** Collects finished requests into a block and hands full blocks to the collectors. */
export class Samples {
  readonly block: SampleBlock = {
    count: 0,
    kernel: new Int32Array(ROWS),
    op: new Uint8Array(ROWS),
    channel: new Int32Array(ROWS),
    bytes: new Float64Array(ROWS),
    donePs: new Float64Array(ROWS),
    stages: STAGES.map(() => new Float64Array(ROWS)),
  };

  /** The block's stage columns by name. */
  readonly stages: Record<
    | 'windowWait'
    | 'downQueue'
    | 'downTransit'
    | 'controllerQueue'
    | 'bankPreparation'
    | 'dataTransfer'
    | 'upQueue'
    | 'upTransit',
    Float64Array
  >;

  constructor(private readonly collectors: readonly Collector[]) {
    const [windowWait, downQueue, downTransit, controllerQueue, bankPreparation, dataTransfer, upQueue, upTransit] =
      this.block.stages;
    this.stages = {
      windowWait,
      downQueue,
      downTransit,
      controllerQueue,
      bankPreparation,
      dataTransfer,
      upQueue,
      upTransit,
    };
  }

  /** Call after a row has been written at index `count`. */
  added(): void {
    if (++this.block.count === ROWS) this.flush();
  }

  flush(): void {
    if (this.block.count === 0) return;
    for (const collector of this.collectors) collector.add(this.block);
    this.block.count = 0;
  }
}
