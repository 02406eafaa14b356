import type { Result } from '../../analysis/result-schema.js';
import { plain } from '../style.js';
import type { RooflineData, RooflinePoint } from './page-data.js';

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
