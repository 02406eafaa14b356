import { z } from 'zod';
import { TIMING_NAMES } from './package.js';

/**
 * The package file as one definition: it validates, types what `resolve` reads, and makes the JSON Schema for editors. Every key
 * says its unit, its default and why. Quantities are strings with units; their units are checked when they are resolved.
 */

const quantities = new WeakSet<z.core.$ZodType>();
const quantity = (text: string) => {
  const type = z.string().meta({ description: text });
  quantities.add(type);
  return type;
};
/** Whether a type of this schema stands for a number with a unit. */
export const isQuantity = (type: z.core.$ZodType): boolean => quantities.has(type);
/** A count has an upper end because tables are sized from it: well above any device, well below what would exhaust memory. */
const count = (text: string, most: number, least = 1) => z.int().min(least).max(most).meta({ description: text });

/** Words that reports repeat on a line: no line ends, and nothing a terminal would take for a command. */
const line = () => z.string().regex(/^\P{Cc}*$/u, 'text without line ends or other control characters');

const organisation = z
  .strictObject({
    channels: count('channels of one stack', 256).optional(),
    pseudo_channels: count('pseudo-channels of one channel', 8).optional(),
    sids: z.int().min(1).max(4).meta({ description: 'stack IDs (ranks) of one pseudo-channel, 1 to 4' }).optional(),
    bank_groups: count('bank groups of one stack ID', 32).optional(),
    banks_per_group: count('banks of one bank group', 64).optional(),
    rows: count('rows of one bank', 2 ** 24).optional(),
    columns: count('atoms of one row', 4096).optional(),
    burst_ck: count('clocks one atom holds the data bus', 64).optional(),
    atom_bytes: count('access granularity, bytes', 4096).optional(),
  })
  .meta({ description: 'overrides of the device’s organisation' });

const timings = z
  .strictObject(
    Object.fromEntries(
      TIMING_NAMES.map((name) => [
        name,
        quantity(`${name}: a time (14 ns), clocks (4 ck) or max(4 ck, 2.5 ns)`).optional(),
      ]),
    ) as Record<(typeof TIMING_NAMES)[number], z.ZodOptional<z.ZodString>>,
  )
  .meta({
    description: 'overrides of the device’s timings; a time in ns is rounded up to clocks (tREFI down), clocks stay',
  });

const refresh = z
  .strictObject({
    mode: z
      .enum(['all-bank', 'per-bank', 'off'])
      .default('all-bank')
      .meta({ description: 'which refresh command is used' }),
    scope: z
      .enum(['pseudo_channel', 'sid'])
      .optional()
      .meta({ description: 'what one REFab closes; default: the device’s' }),
    postpone: z.int().min(1).max(8).optional().meta({
      description:
        'refreshes that may be owed at once: one is owed from when it is due until the rows are closed, so 1 refreshes as soon as due; default: the device’s limit',
    }),
    pull_in: z
      .int()
      .min(0)
      .max(8)
      .optional()
      .meta({ description: 'refreshes that may be done ahead while idle; default: the device’s limit' }),
    temperature: quantity('junction temperature; above 85 C tREFI is halved').default('60 C'),
  })
  .prefault({})
  .meta({ description: 'how the controller refreshes' });

const controller = z
  .strictObject({
    read_queue: count('read entries per pseudo-channel', 4096).default(64),
    write_queue: count('write entries per pseudo-channel', 4096).default(64),
    scheduler: z
      .enum(['fcfs', 'fr-fcfs'])
      .default('fr-fcfs')
      .meta({ description: 'first come first served, or ready row hits first (Rixner et al., 2000)' }),
    hit_cap: count('column commands a row may serve since its ACT while an older conflict waits', 2 ** 30).default(32),
    age_bound: quantity('an entry older than this goes first: nothing starves').default('2 us'),
    page: z.enum(['open', 'closed', 'timeout']).default('open').meta({
      description: 'when rows are closed: on conflict, by auto-precharge when no hit waits, or after page_timeout',
    }),
    page_timeout: quantity('time without a hit after which a row is closed (page: timeout)').default('200 ns'),
    drain_high: count(
      'write entries at which draining starts; default: three quarters of write_queue',
      4096,
    ).optional(),
    drain_low: count('write entries at which draining ends; default: a quarter of write_queue', 4096, 0).optional(),
    pipeline: quantity('from arrival to the answer of a forwarded read or a write acknowledgement').default('5 ns'),
  })
  .prefault({})
  .meta({ description: 'the memory controller, one per pseudo-channel' });

const memory = z
  .strictObject({
    name: line().min(1).meta({ description: 'name that links refer to' }),
    device: z.string().meta({ description: 'device preset, for example hbm3-6.4' }),
    stacks: count('stacks of this memory', 1024),
    clock: quantity('DRAM clock frequency; default: the device’s').optional(),
    organisation: organisation.optional(),
    timings: timings.optional(),
    activate_window_scope: z
      .enum(['pseudo_channel', 'sid'])
      .optional()
      .meta({ description: 'where tRRD and tFAW hold; default: the device’s' }),
    command_buses: z
      .strictObject({
        separate: z.boolean().optional().meta({ description: 'a row bus and a column bus; false: one bus for both' }),
        act: quantity('clocks an ACT holds its bus, for example 1.5 ck').optional(),
        precharge: quantity('clocks a precharge holds its bus').optional(),
        refresh: quantity('clocks a refresh holds its bus').optional(),
        column: quantity('clocks a read or write holds its bus').optional(),
      })
      .optional()
      .meta({ description: 'overrides of the device’s command buses; whole and half clocks' }),
    refresh,
    controller,
    base_die: z
      .strictObject({
        ingress: quantity('link receiver to controller queue').default('5 ns'),
        egress: quantity('DRAM data to link transmitter').default('5 ns'),
      })
      .prefault({})
      .meta({ description: 'fixed latencies of the base die' }),
  })
  .meta({ description: 'one kind of memory' });

const compute = z
  .strictObject({
    name: line().min(1).meta({ description: 'name that links and traces refer to' }),
    clock: quantity('clock of engines and links’ sending side, for example 1.6 GHz'),
    engines: count('independent in-order issue streams', 4096),
    window: count('outstanding requests per engine', 65_536).default(128),
    issue_per_clock: z.int().min(1).max(16).default(1).meta({ description: 'requests an engine issues a clock' }),
    buffering: z
      .int()
      .min(1)
      .max(64)
      .default(2)
      .meta({ description: 'tiles that may be loading or waiting at once, the computing one included' }),
    request: quantity('longest request an engine sends').default('256 B'),
    peak: z
      .record(line().min(1), quantity('peak compute rate in this number format'))
      .default({})
      .meta({ description: 'peak compute rate of the die per number format, for example bf16: 400 TFLOP/s' }),
    edge: quantity('die edge available for links, for example 32 mm').optional(),
  })
  .meta({ description: 'one compute die' });

const link = z
  .strictObject({
    name: line().min(1).meta({ description: 'name of the link; a range of stacks gets .0, .1 … behind it' }),
    from: z.string().meta({ description: 'compute die' }),
    to: z.string().meta({ description: 'stack or stacks of a memory: hbm.0 or hbm.0-2' }),
    lanes: count('lanes of one direction', 65_536),
    rate: quantity('transfer rate of a lane, for example 16 GT/s'),
    flit: quantity('flit size').default('256 B'),
    flit_overhead: quantity('header and CRC of a flit').default('16 B'),
    request_header: quantity('bytes of a read request, and of the header of a write').default('16 B'),
    response_header: quantity('bytes of the header of read data').default('16 B'),
    ack: quantity('bytes of a write acknowledgement').default('8 B'),
    latency: quantity('one way, after serialisation').default('2 ns'),
    landing: quantity('buffer that read data lands in, in the base die’s egress and the receiver together').default(
      '64 KiB',
    ),
  })
  .meta({ description: 'full-duplex die-to-die links from one compute die to one or more stacks' });

export const XOR_TARGETS = ['bank_group', 'bank', 'sid', 'channel', 'pseudo_channel'];
const BITS = '(0|[1-9]\\d*)'; // no leading zeros: one bit has one name
const addressMap = z
  .strictObject({
    interleave: z
      .array(z.enum(['stack', 'channel', 'pseudo_channel']))
      .min(2)
      .meta({ description: 'units consecutive granules go to, fastest first; any counts' }),
    granule: quantity('bytes that stay together before the next unit'),
    rotate: z.boolean().default(false).meta({
      description:
        'each round over the units begins at another one, by a hash of the round’s number: strides no longer meet in few units',
    }),
    fields: z
      .array(z.string().regex(new RegExp(`^(column|bank_group|bank|sid|row|pseudo_channel):${BITS}$`), 'field:bits'))
      .min(1)
      .meta({
        description: 'bit fields inside a unit, lowest first, as field:bits; a field may come back for its higher bits',
      }),
    xor: z
      .record(
        z.string().regex(new RegExp(`^(${XOR_TARGETS.join('|')})\\.${BITS}$`), 'field.bit'),
        z.array(z.string().regex(new RegExp(`^row\\.${BITS}$`), 'row.bit')).min(1),
      )
      .default({})
      .meta({
        description:
          'folding: a bit of bank_group, bank, sid, channel or pseudo_channel, XORed with row bits (Zhang, Zhu and Zhang, 2000)',
      }),
  })
  .meta({ description: 'address to stack, channel, bank, row and column' });

export const packageFile = z
  .strictObject({
    penstock: z.literal(1).meta({ description: 'format version' }),
    extends: z.string().optional().meta({ description: 'another package file that this one is laid over' }),
    name: line().min(1).meta({ description: 'name of the package' }),
    caution: z
      .string()
      .regex(/^(?:\P{Cc}|\s)*$/u, 'text without control characters')
      .default('')
      .meta({ description: 'a sentence that reports repeat, for example that the data is invented' }),
    compute: z.array(compute).min(1).max(64).meta({ description: 'compute dies' }),
    memory: z.array(memory).min(1).max(1).meta({ description: 'memory; one kind for now' }),
    links: z.array(link).min(1).max(1024).meta({ description: 'die-to-die links; every stack has exactly one' }),
    address_map: addressMap,
  })
  .meta({ title: 'penstock package file' });

export type PackageFile = z.output<typeof packageFile>;

/** JSON Schema (draft 2020-12) of package files, for editors. */
export function packageJsonSchema(): unknown {
  return z.toJSONSchema(packageFile, { io: 'input' });
}
