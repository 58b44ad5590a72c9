import { J2000_MJD } from '../../detectors/sky/constants.ts';
import type { SpkKernel } from '../../detectors/sky/spkKernel.ts';
import type { Configuration } from '../config/configuration.ts';
import type { TableSign } from '../review/desk.ts';
import type { ShippedTables } from './loadTables.ts';
import { operatorTables } from './tableEnds.ts';

/** Every table that times are read from and when it ends, for the page Health and the monitoring system. */
export function tableSigns(configuration: Configuration, shipped: ShippedTables, todayMjd: number): TableSign[] {
  const builtIn = [
    { name: 'leap seconds', endsMjd: shipped.leapSeconds.expiresMjd },
    { name: 'Earth and Sun, built in', endsMjd: shipped.earthSun.endMjd },
    ...[...configuration.earth.kernels.values()].map((kernel) => ({
      name: `Earth and Sun, ${basenameOf(kernel)}`,
      endsMjd: endOf(kernel),
    })),
  ].map(({ name, endsMjd }): TableSign => {
    const daysLeft = endsMjd - todayMjd;
    return { name, endsMjd, state: daysLeft < 0 ? 'ended' : daysLeft < SOON_DAYS ? 'ends soon' : 'good' };
  });
  const ofOperator = operatorTables(configuration).map(({ what, endsMjd, patienceDays }): TableSign => {
    const state = endsMjd !== null && todayMjd - endsMjd >= patienceDays ? 'ended' : 'good';
    return { name: what.replace(/^the /, ''), endsMjd, state };
  });
  return [...builtIn, ...ofOperator];
}

const SOON_DAYS = 30;
const SECONDS_PER_DAY = 86_400;

function basenameOf({ name }: SpkKernel): string {
  return name.slice(name.lastIndexOf('/') + 1);
}

function endOf({ segments }: SpkKernel): number {
  return J2000_MJD + Math.max(...segments.map(({ endS }) => endS)) / SECONDS_PER_DAY;
}
