/** Positions as they are written in catalogues: sexagesimal text, or degrees. */

const RAD_PER_DEG = Math.PI / 180;
const SEXAGESIMAL = /^([+-]?)([0-9]{1,3}):([0-9]{1,2}):([0-9]{1,2}(?:\.[0-9]+)?)$/;
const DEGREES = /^[+-]?[0-9]+(?:\.[0-9]+)?$/;

/** Radians in [0, 2π); null for what is not `hh:mm:ss.s` below 24 h or degrees in [0, 360). */
export function parseRightAscension(text: string): number | null {
  const hours = sexagesimal(text);
  const degrees = hours === null ? plainDegrees(text) : hours * 15;
  return degrees === null || degrees < 0 || degrees >= 360 || Object.is(degrees, -0) ? null : degrees * RAD_PER_DEG;
}

/** Radians in [0, 2π); null for what is not `ddd:mm:ss.s` below 360° or degrees in [0, 360). */
export function parseLongitude(text: string): number | null {
  const degrees = sexagesimal(text) ?? plainDegrees(text);
  return degrees === null || degrees < 0 || degrees >= 360 || Object.is(degrees, -0) ? null : degrees * RAD_PER_DEG;
}

/** Radians in [−π/2, π/2]; null for what is not `±dd:mm:ss.s` or degrees in [−90, 90]. */
export function parseDeclination(text: string): number | null {
  const degrees = sexagesimal(text) ?? plainDegrees(text);
  return degrees === null || Math.abs(degrees) > 90 ? null : degrees * RAD_PER_DEG;
}

/** The sign belongs to the whole: −00:30:00 is −0.5. */
function sexagesimal(text: string): number | null {
  const match = SEXAGESIMAL.exec(text);
  if (match === null) return null;
  const minutes = Number(match[3]);
  const seconds = Number(match[4]);
  if (minutes >= 60 || seconds >= 60) return null;
  const size = Number(match[2]) + minutes / 60 + seconds / 3600;
  return match[1] === '-' ? -size : size;
}

function plainDegrees(text: string): number | null {
  return DEGREES.test(text) ? Number(text) : null;
}
