import { onTestFinished } from 'vitest';
import { createTestStation, type TestStation } from './station.ts';

/** A station for the test that runs, closed when that has ended. */
export async function stationForTest(options: Parameters<typeof createTestStation>[0]): Promise<TestStation> {
  const station = await createTestStation(options);
  onTestFinished(() => station.close());
  return station;
}
