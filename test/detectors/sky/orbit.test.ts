import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { eccentricAnomaly } from '../../../detectors/sky/kepler.ts';
import { barycentreOfEmission, orbitDelayOfArrivalS, orbitDelayS } from '../../../detectors/sky/orbit.ts';
import { orbitPhase } from '../../../detectors/sky/orbitPhase.ts';
import type { KeplerianOrbit } from '../../../detectors/spin/orbitModel.ts';
import { addSeconds, daysBetween, type Mjd } from '../../../detectors/time/mjd.ts';
import { inLaplaceParameters, integratedOrbit, keplerianOrbit, STEPS_PER_ORBIT } from '../../support/orbits.ts';

const NS = 1e-9;
const YEAR_S = 365.25 * 86_400;
const degreesPerYear = (degrees: number) => (degrees * Math.PI) / 180 / YEAR_S;

describe('an orbit against direct integration', () => {
  it.each([
    ['eccentric', keplerianOrbit()],
    ['with its periastron advancing by 4.2° a year', keplerianOrbit({ periastronAdvanceRadPerS: degreesPerYear(4.2) })],
    ['advancing by 20° a year', keplerianOrbit({ periastronAdvanceRadPerS: degreesPerYear(20), eccentricity: 0.088 })],
    ['drawn out', keplerianOrbit({ periodDays: 12.37, projectedSemiMajorAxisS: 10, eccentricity: 0.7 })],
    ['wide', keplerianOrbit({ periodDays: 1237, projectedSemiMajorAxisS: 1296, eccentricity: 0.2 })],
  ])('%s: the light path to 1 ns', (_, orbit) => {
    let largest = 0;
    for (const { emission, along } of integratedOrbit(orbit, 2, 97)) {
      const roemerS = orbit.projectedSemiMajorAxisS * along;
      const back = orbitDelayOfArrivalS(orbit, addSeconds(emission, roemerS));
      largest = Math.max(largest, Math.abs(orbitDelayS(orbit, emission) - roemerS), Math.abs(back - roemerS));
    }
    expect(largest).toBeLessThan(NS);
  });

  it('with the companion bending the light: the delay along the path, integrated step by step, to 1 ns', () => {
    const shapiroRangeS = 6.2e-6;
    const shapiroShape = 0.98;
    for (const eccentricity of [0.3, 0]) {
      const orbit = keplerianOrbit({ eccentricity, shapiroRangeS, shapiroShape });
      for (const { emission, along, distance } of integratedOrbit(orbit, 1, 40)) {
        const gravityS = 2 * shapiroRangeS * pathIntegral(distance, shapiroShape * along);
        const wholeS = orbit.projectedSemiMajorAxisS * along + gravityS;
        expect(Math.abs(orbitDelayOfArrivalS(orbit, addSeconds(emission, wholeS)) - wholeS)).toBeLessThan(NS);
      }
    }
  });

  it('with γ from the masses: the time dilation and redshift added up along the orbit, to 1 ns', () => {
    const { pulsarS, companionS } = { pulsarS: 1.44 * 4.925490947e-6, companionS: 1.387 * 4.925490947e-6 };
    const e = 0.617;
    const bare = keplerianOrbit({ eccentricity: e, projectedSemiMajorAxisS: 0 });
    const n = (2 * Math.PI) / (bare.periodDays * 86_400);
    const massS = pulsarS + companionS;
    const separationS = (massS / (n * n)) ** (1 / 3);
    // γ = e n⁻¹ m₂ (m₁ + 2 m₂)/(M a): Damour & Deruelle 1986, from memory.
    const einsteinDelayS = (e / n) * ((companionS * (pulsarS + 2 * companionS)) / (massS * separationS));
    const orbit = { ...bare, einsteinDelayS };
    const slowing = (r: number) => {
      const speedSquared = massS * (2 / r - 1 / separationS) * (companionS / massS) ** 2;
      return companionS / r + speedSquared / 2;
    };
    const places = integratedOrbit(bare, 1, STEPS_PER_ORBIT);
    const stepS = (2 * Math.PI) / n / STEPS_PER_ORBIT;
    const lost = [0];
    for (let i = 1; i < places.length; i++) {
      const [a, b] = [slowing(places[i - 1]!.distance * separationS), slowing(places[i]!.distance * separationS)];
      lost.push(lost[i - 1]! + ((a + b) / 2) * stepS);
    }
    const wholeOrbit = lost[STEPS_PER_ORBIT]!;
    expect(einsteinDelayS).toBeGreaterThan(4e-3);
    for (let i = 0; i <= STEPS_PER_ORBIT; i += 500) {
      const slowedS = lost[i]! - (wholeOrbit * i) / STEPS_PER_ORBIT;
      expect(Math.abs(orbitDelayS(orbit, places[i]!.emission) - slowedS)).toBeLessThan(NS);
    }
  });

  it('with the period changing: orbits counted by adding up 1/P to 1e-11', () => {
    const orbit = keplerianOrbit({ periodDerivative: -2.4e-12 });
    const days = 20_000.3;
    const periodS = orbit.periodDays * 86_400;
    const { whole, angleRad } = orbitPhase(orbit, { day: 50_000, fraction: 0.1 }, { day: 70_000, fraction: 0.4 });
    // ∫ dt/(P + Ṗ t) = ln(1 + Ṗ t/P)/Ṗ; of it what Ṗ changes, so that no digit is lost.
    const change = Math.log1p((orbit.periodDerivative * days * 86_400) / periodS) / orbit.periodDerivative;
    expect(Math.abs(whole + angleRad / (2 * Math.PI) - change)).toBeLessThan(1e-6);
    const still = orbitPhase(
      { ...orbit, periodDerivative: 0 },
      { day: 50_000, fraction: 0.1 },
      { day: 70_000, fraction: 0.4 },
    );
    const slip = (angleRad - still.angleRad) / (2 * Math.PI) + whole - still.whole;
    const second = (-0.5 * orbit.periodDerivative * (days * 86_400) ** 2) / periodS ** 2;
    expect(slip).toBeCloseTo(second, 11);
  });
});

/** −ln of what is lit: ∫ ds/r along the straight path from the pulsar to 10⁶ semi-major axes, less the same for a path from nowhere. */
function pathIntegral(distance: number, along: number): number {
  const end = 1e6;
  const miss = distance * distance - along * along;
  const steps = 20_000;
  const last = Math.log1p(end);
  let sum = 0;
  for (let i = 0; i <= steps; i++) {
    const s = Math.expm1((last * i) / steps);
    const weight = i === 0 || i === steps ? 1 : i % 2 === 1 ? 4 : 2;
    sum += (weight * (1 + s)) / Math.sqrt(miss + (s - along) ** 2);
  }
  return (sum * last) / steps / 3 - Math.log(2 * end);
}

describe('an orbit against published closed forms', () => {
  it('agrees with the closed inverse of Damour & Deruelle 1986, eqs. 46-52 (from memory), to its order', () => {
    const orbit = keplerianOrbit({ periodDays: 1.1, einsteinDelayS: 0.004 });
    const n = (2 * Math.PI) / (orbit.periodDays * 86_400);
    let largest = 0;
    for (let i = 0; i < 50; i++) {
      const arrival = addSeconds(orbit.periastronEpochTdb, i * 1900.7);
      largest = Math.max(largest, Math.abs(orbitDelayOfArrivalS(orbit, arrival) - closedInverse(orbit, n, arrival)));
    }
    // x (n x)³ with the eccentricity's factors.
    const order = orbit.projectedSemiMajorAxisS * (n * orbit.projectedSemiMajorAxisS) ** 3;
    expect(largest).toBeLessThan(order * (1 - orbit.eccentricity) ** -4);
    expect(largest).toBeGreaterThan(0);
  });

  it('at first order in e is eq. A6 of Lange et al. 2001 (from memory): sin Φ + ½ (κ sin 2Φ − η cos 2Φ)', () => {
    const orbit = inLaplaceParameters(keplerianOrbit({ eccentricity: 2e-6, projectedSemiMajorAxisS: 1.9 }));
    for (let i = 0; i < 50; i++) {
      const phi = 0.127 * i;
      const emission = addSeconds(orbit.ascendingNodeEpochTdb, (phi / (2 * Math.PI)) * orbit.periodDays * 86_400);
      const bracket = orbit.eccentricityCosine * Math.sin(2 * phi) - orbit.eccentricitySine * Math.cos(2 * phi);
      expect(orbitDelayS(orbit, emission)).toBeCloseTo(1.9 * (Math.sin(phi) + bracket / 2), 10);
    }
  });

  it('drifts in size, shape and place as its derivatives say, read at periastron and at the node', () => {
    const keplerian = keplerianOrbit({
      periodDays: 2,
      projectedSemiMajorAxisDerivative: 3e-13,
      eccentricityDerivativePerS: 2e-14,
      periastronAdvanceRadPerS: degreesPerYear(1),
    });
    const since = 1000 * 2 * 86_400;
    const omega = keplerian.periastronLongitudeRad + degreesPerYear(1) * since;
    const atPeriastron = (2.34 + 3e-13 * since) * Math.sin(omega) * (1 - (0.617 + 2e-14 * since));
    expect(orbitDelayS(keplerian, { day: 60_000, fraction: 0.4 })).toBeCloseTo(atPeriastron, 10);

    const round = {
      ...inLaplaceParameters(
        keplerianOrbit({ periodDays: 2, eccentricity: 0, projectedSemiMajorAxisDerivative: 3e-13 }),
      ),
      ascendingNodeEpochTdb: { day: 58_000, fraction: 0.4 },
      eccentricitySineDerivativePerS: 2e-14,
      eccentricityCosineDerivativePerS: 1e-14,
    };
    const [eta, kappa] = [2e-14 * since, 1e-14 * since];
    const atNode = (2.34 + 3e-13 * since) * (-eta / 2 + (2 * eta * kappa - 6 * eta * kappa) / 8);
    expect(orbitDelayS(round, { day: 60_000, fraction: 0.4 })).toBeCloseTo(atNode, 14);
  });
});

function closedInverse(orbit: KeplerianOrbit, n: number, arrival: Mjd): number {
  const e = orbit.eccentricity;
  const turns = (daysBetween(arrival, orbit.periastronEpochTdb) / orbit.periodDays) % 1;
  const u = eccentricAnomaly(2 * Math.PI * (turns > 0.5 ? turns - 1 : turns), e);
  const alpha = orbit.projectedSemiMajorAxisS * Math.sin(orbit.periastronLongitudeRad);
  const beta =
    orbit.projectedSemiMajorAxisS * Math.sqrt(1 - e * e) * Math.cos(orbit.periastronLongitudeRad) +
    orbit.einsteinDelayS;
  const [sin, cos] = [Math.sin(u), Math.cos(u)];
  const d = alpha * (cos - e) + beta * sin;
  const first = -alpha * sin + beta * cos;
  const second = -alpha * cos - beta * sin;
  const perU = n / (1 - e * cos);
  const bend = 0.5 * perU * perU * d * (second - ((e * sin) / (1 - e * cos)) * first);
  return d * (1 - perU * first + (perU * first) ** 2 + bend);
}

describe('the two forms', () => {
  const apart = (eccentricity: number, shapiro: Partial<KeplerianOrbit> = {}) => {
    const keplerian = keplerianOrbit({ eccentricity, projectedSemiMajorAxisS: 10, periodDays: 5, ...shapiro });
    const laplace = inLaplaceParameters(keplerian);
    // The published form leaves out −3/2 x η: the same pulse then comes that much later.
    const constantS = 1.5 * 10 * laplace.eccentricitySine;
    let largest = 0;
    for (let i = 0; i < 200; i++) {
      const arrival = addSeconds({ day: 58_003, fraction: 0.2 }, i * 2163.3);
      const one = addSeconds(arrival, -orbitDelayOfArrivalS(keplerian, arrival));
      const later = addSeconds(arrival, constantS);
      const other = addSeconds(later, -orbitDelayOfArrivalS(laplace, later));
      largest = Math.max(largest, Math.abs(daysBetween(one, other)) * 86_400);
    }
    return largest;
  };

  it('become the same orbit as e → 0, the difference falling as x e³', () => {
    for (const eccentricity of [3e-2, 1e-2, 3e-3]) {
      expect(apart(eccentricity)).toBeLessThan(10 * eccentricity ** 3);
      expect(apart(eccentricity)).toBeGreaterThan(10 * eccentricity ** 3 * 0.1);
    }
    expect(apart(3e-4)).toBeLessThan(NS);
    expect(apart(0)).toBeLessThan(0.1 * NS);
  });

  it('bend the light alike', () => {
    const shapiro = { shapiroRangeS: 5e-6, shapiroShape: 0.95 };
    expect(apart(4e-4, shapiro)).toBeLessThan(NS);
    expect(apart(0, shapiro)).toBeLessThan(0.1 * NS);
  });
});

describe('there and back', () => {
  const within = (min: number, max: number) => fc.double({ min, max, noNaN: true });

  it('a pulse that left a binary is brought back to when it left, to 0.1 ns', () => {
    fc.assert(
      fc.property(
        fc.record({
          speed: within(1e-6, 0.02),
          logPeriod: within(-1, 3.5),
          eccentricity: within(0, 0.95),
          omega: within(-6, 6),
          day: fc.integer({ min: 45_000, max: 68_000 }),
          fraction: fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
          laplace: fc.boolean(),
        }),
        ({ speed, logPeriod, eccentricity, omega, day, fraction, laplace }) => {
          const periodDays = 10 ** logPeriod;
          const e = laplace ? eccentricity * 0.01 : eccentricity;
          const axis = (speed * periodDays * 86_400 * Math.sqrt((1 - e) / (1 + e))) / (2 * Math.PI);
          const keplerian = keplerianOrbit({
            periodDays,
            eccentricity: e,
            projectedSemiMajorAxisS: axis,
            periastronLongitudeRad: omega,
            shapiroRangeS: 5e-6,
            shapiroShape: 0.999,
            einsteinDelayS: 1e-3,
            periodDerivative: 1e-12,
          });
          const orbit = laplace ? inLaplaceParameters(keplerian) : keplerian;
          const emission = { day, fraction };
          const arrival = barycentreOfEmission(orbit, emission);
          const back = addSeconds(arrival, -orbitDelayOfArrivalS(orbit, arrival));
          expect(Math.abs(daysBetween(back, emission)) * 86_400).toBeLessThan(0.1 * NS);
        },
      ),
      { seed: 11, numRuns: 1500 },
    );
  });

  it('an isolated pulsar stays as it is', () => {
    const emission = { day: 58_000, fraction: 0.25 };
    expect(barycentreOfEmission(undefined, emission)).toBe(emission);
  });
});
