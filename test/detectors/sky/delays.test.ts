import { describe, expect, it } from 'vitest';
import {
  directionAt,
  dispersionMeasureAt,
  dispersionS,
  pulsarDirection,
  roemerS,
  solarWindMeasure,
  sunShapiroS,
} from '../../../detectors/sky/delays.ts';
import { dot, type Vector } from '../../../detectors/sky/vector.ts';
import { pulsarAt } from '../../support/sky.ts';

const AU_KM = 149_597_870.7;
const PARSEC_KM = (AU_KM * 648_000) / Math.PI;
const US = 1e-6;

describe('Roemer delay', () => {
  it('is one astronomical unit of light time towards the pulsar: 499.004783836 s (IAU 2009 system of constants)', () => {
    const pulsar = pulsarDirection(pulsarAt({ parallaxMas: 0, properMotionMasPerYr: [0, 0] }));
    const n = pulsar.towards;
    expect(roemerS(pulsar, n, [n[0] * AU_KM, n[1] * AU_KM, n[2] * AU_KM])).toBeCloseTo(499.004783836, 8);
  });

  it('with parallax is the exact difference of the two distances', () => {
    const parallaxMas = 3.5;
    const pulsar = pulsarDirection(pulsarAt({ parallaxMas, properMotionMasPerYr: [0, 0] }));
    const distanceKm = (1000 / parallaxMas) * PARSEC_KM;
    const n = pulsar.towards;
    const observer: Vector = [0.3 * AU_KM, -0.8 * AU_KM, 0.4 * AU_KM];
    // distance − |distance·n − observer|, written without the cancellation of two large numbers
    const along = dot(n, observer);
    const squares = 2 * distanceKm * along - dot(observer, observer);
    const far = Math.sqrt(distanceKm * distanceKm - squares);
    expect(Math.abs(roemerS(pulsar, n, observer) - squares / (distanceKm + far) / 299_792.458)).toBeLessThan(1e-10);
  });

  it('moves with the proper motion: 1 mas is at most 2.42 µs', () => {
    const still = pulsarDirection(pulsarAt({ properMotionMasPerYr: [0, 0], parallaxMas: 0 }));
    const moving = pulsarDirection(pulsarAt({ properMotionMasPerYr: [0, 1], parallaxMas: 0 }));
    const later = { day: 59_365, fraction: 0.25 };
    const north: Vector = [
      -Math.sin(0.54) * Math.cos(1.1) * AU_KM,
      -Math.sin(0.54) * Math.sin(1.1) * AU_KM,
      Math.cos(0.54) * AU_KM,
    ];
    const gain = roemerS(moving, directionAt(moving, later), north) - roemerS(still, directionAt(still, later), north);
    expect(gain / US).toBeCloseTo(2.4193, 3);
  });
});

describe('Shapiro delay of the Sun', () => {
  const n: Vector = [1, 0, 0];

  it('is nothing at right angles and −2 GM/c³ ln 2 = −6.8282 µs opposite', () => {
    expect(sunShapiroS(n, [0, AU_KM, 0])).toBeCloseTo(0, 15);
    expect(sunShapiroS(n, [AU_KM, 0, 0]) / US).toBeCloseTo(-2 * 4.92549095 * Math.LN2, 5);
  });

  it('stays finite behind the Sun', () => {
    const grazing = sunShapiroS(n, [-AU_KM, 0, 0]);
    expect(grazing / US).toBeGreaterThan(100);
    expect(grazing / US).toBeLessThan(125);
  });
});

describe('dispersion delay', () => {
  // 1/2.41e-4 · DM / f²: DM 100 gives 0.2117 s at 1400 MHz and 2.593 s at 400 MHz (by hand).
  it.each([
    [1400, 0.2117],
    [400, 2.5934],
  ])('DM 100 at %d MHz', (frequencyMhz, seconds) => {
    expect(dispersionS(100, frequencyMhz, 0)).toBeCloseTo(seconds, 4);
  });

  it('grows when the telescope approaches the pulsar, and is 0 at infinite frequency', () => {
    const speed = 30;
    expect(dispersionS(100, 1400, speed) / dispersionS(100, 1400, 0) - 1).toBeCloseTo(2e-4, 6);
    expect(dispersionS(100, Number.POSITIVE_INFINITY, speed)).toBe(0);
  });

  it('follows a measure that changes by so much a year from its epoch', () => {
    const pulsar = pulsarDirection(
      pulsarAt({ dispersionMeasure: 40, dispersionMeasureSlope: { perYr: 0.02, epochMjd: 59_000 } }),
    );
    expect(dispersionMeasureAt(pulsar, { day: 59_000, fraction: 0 })).toBe(40);
    expect(dispersionMeasureAt(pulsar, { day: 59_730, fraction: 0.5 })).toBeCloseTo(40.04, 12);
    expect(dispersionMeasureAt(pulsarDirection(pulsarAt({})), { day: 70_000, fraction: 0 })).toBe(41.27);
  });
});

describe('solar wind', () => {
  const n: Vector = [1, 0, 0];
  const atElongation = (degrees: number): Vector => {
    const angle = Math.PI - (degrees * Math.PI) / 180;
    return [AU_KM * Math.cos(angle), AU_KM * Math.sin(angle), 0];
  };

  // n₀ (au/pc) ρ/sin ρ with n₀ = 7.9 cm⁻³, by hand: 6.02e-5 pc cm⁻³ at 90° from the Sun; delays at 1.4 GHz.
  it.each([
    [90, 0.127, 3],
    [10, 1.385, 3],
    [5, 2.84, 2],
  ])('at %d° from the Sun delays by %d µs at 1.4 GHz', (degrees, microseconds, digits) => {
    const measure = solarWindMeasure(7.9, n, atElongation(degrees));
    expect(dispersionS(measure, 1400, 0) / US).toBeCloseTo(microseconds, digits);
  });

  it('is the density added up along the line of sight', () => {
    for (const degrees of [20, 90, 140, 180]) {
      const observer: Vector = atElongation(degrees).map((km) => 1.01 * km) as unknown as Vector;
      // Steps growing outwards, s = e^w − 1 in au, midpoint rule.
      let sum = 0;
      const steps = 20_000;
      const last = Math.log1p(1e5);
      for (let i = 0; i < steps; i++) {
        const w = ((i + 0.5) * last) / steps;
        const at: Vector = [observer[0] / AU_KM + Math.expm1(w), observer[1] / AU_KM, 0];
        sum += (7.9 / dot(at, at)) * Math.exp(w) * (last / steps);
      }
      expect(solarWindMeasure(7.9, n, observer) / ((sum * AU_KM) / PARSEC_KM)).toBeCloseTo(1, 4);
    }
  });

  it('stays finite behind the Sun, and is nothing without electrons', () => {
    expect(solarWindMeasure(7.9, n, [-AU_KM, 0, 0])).toBeLessThan(0.03);
    expect(solarWindMeasure(0, n, [-AU_KM, 0, 0])).toBe(0);
  });
});
