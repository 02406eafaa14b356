import type { Result } from '../../analysis/result-schema.js';
import { plain } from '../style.js';

/** The roofline plot: kernels with flops as points over FLOP per moved byte, and the ceilings of the whole package. */
export interface RooflineData {
  readonly points: readonly RooflinePoint[];
  readonly slopes: readonly { readonly label: string; readonly bytesPerS: number }[]; // ceilings of bandwidth
  readonly roofs: readonly { readonly label: string; readonly flopsPerS: number }[]; // ceilings by number format
  /** Every kernel that moved or computed anything, against its bound. */
  readonly reached: readonly { readonly name: string; readonly ratio: number; readonly estimate: number | null }[];
}

export interface RooflinePoint {
  readonly name: string;
  readonly intensity: number; // FLOP per moved byte
  readonly attained: number; // FLOP/s
  readonly bound: number;
  readonly estimate: number | null; // FLOP/s if the trace's own estimate of the time held
  readonly by: string; // which ceiling its bound is
}

export function rooflineData({ kernels, bandwidth, package: pkg }: Result): RooflineData {
  const points = kernels.flatMap((kernel): RooflinePoint[] => {
    const {
      name,
      flops,
      intensity_moved: intensity,
      attained_flops_per_s: attained,
      bound_flops_per_s: bound,
    } = kernel;
    if (intensity === null || !attained || !bound) return [];
    const { estimate_ps, bound_by: by } = kernel;
    const estimate = estimate_ps === null ? null : flops / (estimate_ps / 1e12);
    return [{ name: plain(name), intensity, attained, bound, estimate, by }];
  });
  const used = new Set(kernels.filter(({ flops }) => flops > 0).map(({ format }) => format));
  const formats = [...new Set(pkg.dies.flatMap((die) => Object.keys(die.peakFlops)))];
  return {
    points,
    slopes: [
      { label: 'DRAM peak', bytesPerS: bandwidth.peak_bytes_per_s },
      { label: 'less refresh', bytesPerS: bandwidth.refresh_derated_bytes_per_s },
      { label: 'links, this mix', bytesPerS: bandwidth.link_ceiling_bytes_per_s },
    ],
    roofs: formats
      .filter((format) => used.has(format) || used.size === 0 || used.has(''))
      .map((format) => ({
        label: plain(format),
        flopsPerS: pkg.dies.reduce((sum, die) => sum + (die.peakFlops[format] ?? 0), 0),
      })),
    reached: kernels.flatMap((kernel) => {
      const { name, roofline_ratio: ratio, estimate_ps: estimate, duration_ps: duration } = kernel;
      if (ratio === null) return [];
      // where the estimate would stand on the same scale: the bound's time over the estimated time
      return [
        {
          name: plain(name),
          ratio,
          estimate: estimate === null || estimate === 0 ? null : (ratio * duration) / estimate,
        },
      ];
    }),
  };
}
