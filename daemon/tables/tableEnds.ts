import type { Configuration } from '../config/configuration.ts';

/**
 * Tables that end before today, so that arrivals are marked `extrapolated`. Each kind has the patience that its publisher needs: clock
 * tables are the observatory's own, the IERS's C04 runs a month behind, TT(BIPM) comes out once a year.
 */
export function endedTableWarnings({ sites, earth }: Configuration, todayMjd: number): string[] {
  const clocks = sites.map(({ name, clockTable }) => ({
    what: `the clock table of ${name}`,
    dates: clockTable?.mjd,
    patienceDays: 1,
    remedy: 'later arrivals are uncorrected and marked; deliver a newer table',
  }));
  const tables = [
    ...clocks,
    {
      what: 'the Earth orientation file',
      dates: earth.orientation?.mjdUtc,
      patienceDays: 45,
      remedy: 'its last values are held and arrivals marked; fetch a newer one from the IERS',
    },
    {
      what: 'the TT(BIPM) table',
      dates: earth.ttBipm?.mjd,
      patienceDays: 400,
      remedy: 'its last value is held and arrivals marked; the BIPM publishes a new one each January',
    },
  ];
  return tables.flatMap(({ what, dates, patienceDays, remedy }) => {
    const end = dates?.at(-1);
    if (end === undefined || todayMjd - end < patienceDays) return [];
    return [`${what} ends at MJD ${end}, ${Math.floor(todayMjd - end)} days ago: ${remedy}`];
  });
}
