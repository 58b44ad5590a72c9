import { describe, expect, it } from 'vitest';
import { mixtureEstimate } from '../../../detectors/recovery/mixture.ts';
import { timescaleLattices } from '../../../detectors/recovery/timescaleLattice.ts';
import { timescaleMarginal } from '../../../detectors/recovery/timescaleMarginals.ts';

/** ln of the longest over the shortest timescale. */
const LN_RANGE = 6;
const range = { lowDays: 1, highDays: Math.exp(LN_RANGE) };

/** Weight of a normal density without its norm, all pairs of timescales correlated alike; and what the lattice finds. */
function weigh(centre: readonly number[], sds: readonly number[], correlation: number) {
  const count = centre.length;
  const spread = 1 + (count - 1) * correlation;
  let looks = 0;
  const lattices = timescaleLattices(count, range, (timescales) => {
    looks += 1;
    const parts = timescales.map((t) => Math.log(t) / LN_RANGE).sort((a, b) => a - b);
    const away = parts.map((part, i) => (part - centre[i]!) / sds[i]!);
    const squares = away.reduce((sum, z) => sum + z * z, 0);
    const sum = away.reduce((total, z) => total + z, 0);
    const height = (-0.5 * (squares - (correlation / spread) * sum * sum)) / (1 - correlation);
    return { height, value: height };
  });
  const cells = lattices.flatMap((lattice) => lattice.cells);
  const found = cells.reduce((sum, { logWeight, value }) => sum + Math.exp(logWeight + value), 0);
  const determinant = (1 - correlation) ** (count - 1) * spread;
  const orders = [1, 1, 2, 6][count]!;
  const exact = orders * (2 * Math.PI) ** (count / 2) * Math.sqrt(determinant) * sds.reduce((a, b) => a * b, 1);
  return { lattices, ratio: found / exact, looks };
}

// The integral of a multivariate normal density: (2π)^(n/2) √det C.
describe('the integral over the logarithms of timescales', () => {
  it.each([
    { centre: [0.37], sds: [1e-6], correlation: 0 },
    { centre: [0.37], sds: [0.05], correlation: 0 },
    { centre: [0.3, 0.7], sds: [1e-5, 1e-5], correlation: 0.9 },
    { centre: [0.3, 0.7], sds: [1e-4, 0.04], correlation: 0 },
    { centre: [0.3, 0.7], sds: [0.02, 0.04], correlation: 0.5 },
    { centre: [0.2, 0.5, 0.8], sds: [1e-6, 1e-4, 1e-3], correlation: 0.8 },
    { centre: [0.2, 0.5, 0.8], sds: [0.01, 0.01, 0.03], correlation: 0.5 },
  ])('is that of a normal density with widths $sds, correlation $correlation', ({ centre, sds, correlation }) => {
    const { ratio, looks } = weigh(centre, sds, correlation);
    expect(Math.abs(ratio - 1)).toBeLessThan(0.03);
    expect(looks).toBeLessThan(1200);
  });

  it('is 1 where the arrivals say nothing', () => {
    for (const terms of [1, 2, 3]) {
      const [lattice] = timescaleLattices(terms, range, () => ({ height: 0, value: 0 }));
      const total = lattice!.cells.reduce((sum, { logWeight }) => sum + Math.exp(logWeight), 0);
      expect(Math.abs(total - 1), `${terms}`).toBeLessThan(0.35);
    }
  });

  it('ends at the shortest timescale where ever shorter ones fit better', () => {
    // Falls off from the wall as e^(−x/10⁻⁷): its integral is 10⁻⁷.
    const [lattice] = timescaleLattices(1, range, ([timescale]) => {
      const height = (-1e7 * Math.log(timescale!)) / LN_RANGE;
      return { height, value: height };
    });
    const total = lattice!.cells.reduce((sum, { logWeight, value }) => sum + Math.exp(logWeight + value), 0);
    expect(lattice!.cells[0]!.timescalesDays[0]).toBeCloseTo(1, 9);
    expect(Math.abs(Math.log(total / 1e-7))).toBeLessThan(0.35);
  });
});

// The quantiles of a normal distribution: mean ± σ and ± 2σ.
describe('the marginal of one timescale', () => {
  it.each([
    { centre: [0.37], sds: [1e-6], correlation: 0 },
    { centre: [0.37], sds: [0.05], correlation: 0 },
    { centre: [0.3, 0.7], sds: [1e-5, 1e-5], correlation: 0.9 },
    { centre: [0.3, 0.7], sds: [0.02, 0.04], correlation: 0.5 },
    { centre: [0.2, 0.5, 0.8], sds: [1e-6, 1e-4, 1e-3], correlation: 0.8 },
    { centre: [0.2, 0.5, 0.8], sds: [0.01, 0.01, 0.03], correlation: 0 },
  ])('is that of a normal density with widths $sds, correlation $correlation', ({ centre, sds, correlation }) => {
    const lattices = weigh(centre, sds, correlation).lattices.map(({ cells, cellSds }) => ({
      cells: cells.map(({ timescalesDays, logWeight, value }) => ({ timescalesDays, logMass: logWeight + value })),
      cellSds,
    }));
    centre.forEach((middle, j) => {
      const { interval68, interval95, median } = mixtureEstimate(timescaleMarginal(lattices, j));
      const sigmas = (ln: number) => (ln / LN_RANGE - middle) / sds[j]!;
      const found = [interval95[0], interval68[0], median, interval68[1], interval95[1]].map(sigmas);
      [-2, -1, 0, 1, 2].forEach((expected, i) => {
        expect(Math.abs(found[i]! - expected), `${expected} σ of timescale ${j + 1}`).toBeLessThan(0.04);
      });
    });
  });
});
