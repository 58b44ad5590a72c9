import type { Configuration } from '../config/configuration.ts';

/** A table that the operator keeps. */
export interface OperatorTable {
  readonly what: string;
  /** Of its last row; null: the table is empty. */
  readonly endsMjd: number | null;
  /** How long after its end nobody need be told: what its publisher needs for the next. */
  readonly patienceDays: number;
  readonly remedy: string;
}

/** Clock tables are the observatory's own, the IERS's C04 runs a month behind, TT(BIPM) comes out once a year. */
export function operatorTables({ sites, earth }: Configuration): OperatorTable[] {
  const clocks = sites.flatMap(({ name, clockTable }) =>
    clockTable === null
      ? []
      : {
          what: `the clock table of ${name}`,
          endsMjd: clockTable.mjd.at(-1) ?? null,
          patienceDays: 1,
          remedy: 'later arrivals are uncorrected and marked; deliver a newer table',
        },
  );
  const orientation = {
    what: 'the Earth orientation file',
    endsMjd: earth.orientation?.mjdUtc.at(-1) ?? null,
    patienceDays: 45,
    remedy: 'its last values are held and arrivals marked; fetch a newer one from the IERS',
  };
  const ttBipm = {
    what: 'the TT(BIPM) table',
    endsMjd: earth.ttBipm?.mjd.at(-1) ?? null,
    patienceDays: 400,
    remedy: 'its last value is held and arrivals marked; the BIPM publishes a new one each January',
  };
  return [...clocks, ...(earth.orientation === null ? [] : [orientation]), ...(earth.ttBipm === null ? [] : [ttBipm])];
}

/** Tables that end before today, so that arrivals are marked `extrapolated`. */
export function endedTableWarnings(configuration: Configuration, todayMjd: number): string[] {
  return operatorTables(configuration).flatMap(({ what, endsMjd, patienceDays, remedy }) =>
    endsMjd === null || todayMjd - endsMjd < patienceDays
      ? []
      : `${what} ends at MJD ${endsMjd}, ${Math.floor(todayMjd - endsMjd)} days ago: ${remedy}`,
  );
}
