import type { LossName } from '../analysis/index.js';
import type { StageName } from '../engine/recording.js';

/** What the classes of the bandwidth stack, and other losses, are called on the page. */
export const LABELS: Readonly<Record<LossName, string>> = {
  read_data: 'read data',
  write_data: 'write data',
  refresh: 'refresh',
  row_cycle: 'row cycle',
  activate_window: 'activate window',
  column_gap: 'column gap',
  turnaround: 'turnaround',
  command_bus: 'command bus',
  starved_down_link: 'no work: down link',
  starved_up_link: 'no work: up link',
  starved_queue_credits: 'no work: queue credits',
  starved_window: 'no work: window',
  starved_compute: 'no work: compute',
  starved_imbalance: 'no work: imbalance',
  starved_arrivals: 'no work: arrivals',
  starved_drain: 'no work: drain',
  other_kernels: 'other kernels',
  refresh_put_off: 'refresh put off',
};

/** What the stages of a request's life are called on the page. */
export function stageLabel(stage: StageName): string {
  return stage.replaceAll('_', ' ');
}
