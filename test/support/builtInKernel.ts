import { loadTables } from '../../daemon/tables/loadTables.ts';
import type { ChebyshevTable } from '../../detectors/sky/chebyshevTable.ts';
import { J2000_MJD } from '../../detectors/sky/constants.ts';
import type { SpkArray } from './spkFile.ts';

/**
 * The built-in table's own series of some years, as the arrays of a kernel: the Earth by way of the Earth-Moon barycentre.
 * `shiftKm` puts the Earth off along the first axis.
 */
export function builtInArrays(fromMjd: number, toMjd: number, { shiftKm = 0 } = {}): SpkArray[] {
  const { earth, sun } = loadTables({ hostLeapSecondFiles: [] }).tables.earthSun;
  const whole = arrayOf(earth, 3, fromMjd, toMjd);
  const records = whole.records.map((record) =>
    record.map((value, i) => value - (MOONS_PULL[Math.floor(i / earth.terms)]?.[i % earth.terms] ?? 0)),
  );
  const pull = MOONS_PULL.flat();
  pull[0] = pull[0]! + shiftKm;
  const fromCentre = { ...whole, target: 399, centre: 3, records: records.map(() => pull) };
  return [{ ...whole, records }, fromCentre, arrayOf(sun, 10, fromMjd, toMjd)];
}

/** Made up, km: three coefficients for each axis, taken off the one array and put into the other. */
const MOONS_PULL = [
  [3000, 40, -5],
  [-2000, 30, 3],
  [900, -20, 1],
];

function arrayOf(table: ChebyshevTable, target: number, fromMjd: number, toMjd: number): SpkArray {
  const length = table.components * table.terms;
  const first = Math.floor((fromMjd - table.startMjd) / table.stepDays);
  const last = Math.ceil((toMjd - table.startMjd) / table.stepDays);
  const records = Array.from({ length: last - first }, (_, i) => [
    ...table.coefficients.subarray((first + i) * length, (first + i + 1) * length),
  ]);
  const firstS = (table.startMjd + first * table.stepDays - J2000_MJD) * 86_400;
  return { target, centre: 0, type: 2, firstS, intervalS: table.stepDays * 86_400, records };
}
