import type { GaussianMixture } from './mixture.ts';
import { moments } from './mixture.ts';

/** The cells around one maximum of a posterior over timescales. */
export interface WeighedLattice {
  readonly cells: readonly { readonly timescalesDays: readonly number[]; readonly logMass: number }[];
  /** Along each axis: sd, in ln τ, of the neighbourhood that one cell stands for. */
  readonly cellSds: readonly number[];
}

/**
 * The marginal of ln τ of exponential `j`. The steps of a lattice are nearly as wide as what it covers: cells taken for points,
 * or spread over their neighbourhood, would make it too wide. So each is spread, and all are drawn towards their common mean by as
 * much as keeps mean and variance (West 1993, J. R. Stat. Soc. B 55, 409): exact where the posterior is normal in ln τ.
 */
export function timescaleMarginal(lattices: readonly WeighedLattice[], j: number): GaussianMixture {
  const heaviest = Math.max(...lattices.flatMap(({ cells }) => cells.map(({ logMass }) => logMass)));
  const parts = lattices.map(({ cells, cellSds }) => {
    const weights = Float64Array.from(cells, ({ logMass }) => Math.exp(logMass - heaviest));
    const places = Float64Array.from(cells, ({ timescalesDays }) => Math.log(timescalesDays[j]!));
    const { mean, sd } = moments({ weights, means: places, sds: new Float64Array(places.length) });
    const spread = Math.min(cellSds[j]!, sd);
    const drawn = sd > 0 ? Math.sqrt(1 - (spread / sd) ** 2) : 1;
    return { weights, means: places.map((x) => mean + drawn * (x - mean)), sds: places.map(() => spread) };
  });
  const joined = (of: (part: GaussianMixture) => Float64Array) =>
    Float64Array.from(parts.flatMap((part) => [...of(part)]));
  return { weights: joined((p) => p.weights), means: joined((p) => p.means), sds: joined((p) => p.sds) };
}
