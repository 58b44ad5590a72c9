import { describe, expect, it } from 'vitest';
import { directionAt, dispersionS, pulsarDirection, roemerS, sunShapiroS } from '../../../detectors/sky/delays.ts';
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
});
