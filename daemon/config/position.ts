import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { parseDeclination, parseLongitude, parseRightAscension } from './angles.ts';
import { type EclipticPosition, equatorialFromEcliptic, OBLIQUITY_ARCSEC } from './ecliptic.ts';
import type { SectionReader } from './sectionReader.ts';

export type Position = Pick<PulsarModel, 'rightAscensionRad' | 'declinationRad' | 'properMotionMasPerYr'>;

/** What of a position stands in the head of a pulsar's file as the schema returns it. */
export interface PositionKeys {
  readonly proper_motion_mas_per_yr?: readonly [number, number] | undefined;
  readonly ecliptic_proper_motion_mas_per_yr?: readonly [number, number] | undefined;
  readonly ecliptic_obliquity_arcsec?: number | undefined;
}

const EQUATORIAL = ['right_ascension', 'declination', 'proper_motion_mas_per_yr'];
const ECLIPTIC = [
  'ecliptic_longitude',
  'ecliptic_latitude',
  'ecliptic_proper_motion_mas_per_yr',
  'ecliptic_obliquity_arcsec',
];

/** Where the pulsar stands, in ICRS, from whichever of the two kinds of position its file gives; null after a complaint. */
export function readPosition(reader: SectionReader, keys: PositionKeys): Position | null {
  const ecliptic = ECLIPTIC.find((key) => reader.has([key]));
  const equatorial = EQUATORIAL.find((key) => reader.has([key]));
  if (ecliptic === undefined) {
    const rightAscensionRad = angle(reader, 'right_ascension', parseRightAscension, HOURS);
    const declinationRad = angle(reader, 'declination', parseDeclination, DEGREES_OF_ARC);
    if (rightAscensionRad === null || declinationRad === null) return null;
    return { rightAscensionRad, declinationRad, properMotionMasPerYr: keys.proper_motion_mas_per_yr ?? [0, 0] };
  }
  if (equatorial !== undefined) {
    reader.error([ecliptic], `stands beside ${equatorial}: give the position in one kind of coordinates`);
    return null;
  }
  const longitudeRad = angle(reader, 'ecliptic_longitude', parseLongitude, '"ddd:mm:ss.s" or degrees from 0 to 360');
  const latitudeRad = angle(reader, 'ecliptic_latitude', parseDeclination, DEGREES_OF_ARC);
  if (longitudeRad === null || latitudeRad === null) return null;
  const position: EclipticPosition = {
    longitudeRad,
    latitudeRad,
    properMotionMasPerYr: keys.ecliptic_proper_motion_mas_per_yr ?? [0, 0],
    obliquityArcsec: keys.ecliptic_obliquity_arcsec ?? OBLIQUITY_ARCSEC,
  };
  return equatorialFromEcliptic(position);
}

const HOURS = '"hh:mm:ss.s" or degrees from 0 to 360';
const DEGREES_OF_ARC = '"±dd:mm:ss.s" or degrees from -90 to 90';

function angle(
  reader: SectionReader,
  key: string,
  parse: (text: string) => number | null,
  wanted: string,
): number | null {
  const text = reader.document.textOf([key]);
  if (text === null) {
    reader.error([key], reader.has([key]) ? `must be ${wanted}` : 'is missing');
    return null;
  }
  const radians = parse(text);
  if (radians === null) reader.error([key], `must be ${wanted}, found "${text}"`);
  return radians;
}
