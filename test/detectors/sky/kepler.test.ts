import { describe, expect, it } from 'vitest';
import { eccentricAnomaly, trueAnomaly } from '../../../detectors/sky/kepler.ts';

const ECCENTRICITIES = [0, 1e-12, 0.1, 0.5, 0.9, 0.97, 0.99];

describe("Kepler's equation", () => {
  it.each(ECCENTRICITIES)('gives back the eccentric anomaly to 1e-14 at e = %d', (e) => {
    let largest = 0;
    for (let i = -20_000; i <= 20_000; i++) {
      // Cubed, so that many lie close to periastron, where the equation is nearly flat.
      const u = Math.PI * (i / 20_000) ** 3;
      largest = Math.max(largest, Math.abs(eccentricAnomaly(u - e * Math.sin(u), e) - u));
    }
    expect(largest).toBeLessThan(1e-14);
  });

  it('gives the true anomaly of the textbook: cos A = (cos u − e)/(1 − e cos u), with the sign of u', () => {
    for (const e of ECCENTRICITIES) {
      for (const u of [-3, -1, -1e-4, 0, 0.3, 2, Math.PI]) {
        const anomaly = trueAnomaly(u, e);
        expect(Math.cos(anomaly)).toBeCloseTo((Math.cos(u) - e) / (1 - e * Math.cos(u)), 13);
        expect(Math.sin(anomaly)).toBeCloseTo((Math.sqrt(1 - e * e) * Math.sin(u)) / (1 - e * Math.cos(u)), 13);
      }
    }
  });
});
