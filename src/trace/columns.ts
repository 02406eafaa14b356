/** The names of a trace's columns. */

/** Columns of an access trace. At most one of the time columns may be there. */
export const ACCESS_COLUMNS = {
  required: ['op', 'address', 'bytes'],
  time: ['time_ps', 'time_ns', 'time_us', 'cycle'],
  optional: ['die', 'engine', 'kernel', 'tile', 'flops', 'after'],
} as const;

/** Columns of a kernel trace. A cell of a required column may still be empty where the column has a default. */
export const KERNEL_COLUMNS = {
  required: ['kernel', 'stream', 'format', 'flops', 'read', 'write', 'read_pattern', 'write_pattern'],
  optional: ['tile', 'die', 'repeat', 'estimate_us'],
} as const;
