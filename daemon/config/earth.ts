import { parseEarthOrientation } from '../../detectors/sky/earthOrientationFile.ts';
import { parseTtBipmTable } from '../../detectors/time/ttBipm.ts';
import type { KernelShelf } from '../tables/kernelFile.ts';
import type { ConfigProblem, EarthSettings } from './configuration.ts';
import type { Surroundings } from './mailSettings.ts';
import type { SectionReader } from './sectionReader.ts';
import { earthTable } from './sections.ts';
import { readTextFile } from './textFile.ts';

/** Sixty years of days at 250 bytes each are 6 MB. */
const LONGEST_ORIENTATION_BYTES = 32 * 1024 * 1024;

/** The section [earth]: tables that the operator keeps beside the built-in ones. Read at the start, as the clock tables are. */
export function readEarth(
  reader: SectionReader,
  around: Surroundings,
  shelf: KernelShelf,
  problems: ConfigProblem[],
): EarthSettings {
  const table = reader.has(['earth']) ? reader.read(['earth'], earthTable) : null;
  const load = <Found>(key: Key, read: (file: string, place: Place) => Found | null): Found | null => {
    const named = table?.[key];
    if (named === undefined) return null;
    const file = around.absolute(named);
    const refuse = (message: string) => reader.error(['earth', key], `${file} ${message}`);
    return read(file, { refuse, atLine: (problem) => problems.push({ file, column: null, ...problem }) });
  };
  return {
    orientation: load('orientation_file', loadOrientation),
    ttBipm: load('tt_bipm_file', loadTtBipm),
    kernel: load('kernel_file', (file, { refuse }) => {
      const taken = shelf.take(file);
      if ('kernel' in taken) return taken.kernel;
      refuse(taken.problem);
      return null;
    }),
    kernels: shelf.kernels,
  };
}

type Key = 'orientation_file' | 'kernel_file' | 'tt_bipm_file';

/** Where a complaint goes: to the key that names the file, or to a line of the file. */
interface Place {
  refuse(message: string): void;
  atLine(problem: Pick<ConfigProblem, 'line' | 'message' | 'severity'>): void;
}

function loadOrientation(file: string, { refuse, atLine }: Place) {
  const read = readTextFile(file, { longestBytes: LONGEST_ORIENTATION_BYTES });
  if ('problem' in read) {
    refuse(read.problem);
    return null;
  }
  const parsed = parseEarthOrientation(read.text, file);
  if ('table' in parsed) return parsed.table;
  atLine({ line: parsed.line, message: parsed.problem, severity: 'error' });
  return null;
}

function loadTtBipm(file: string, { refuse, atLine }: Place) {
  const read = readTextFile(file);
  if ('problem' in read) {
    refuse(read.problem);
    return null;
  }
  const parsed = parseTtBipmTable(read.text, file);
  if ('problems' in parsed) {
    for (const problem of parsed.problems) atLine({ ...problem, severity: 'error' });
    return null;
  }
  for (const warning of parsed.warnings) atLine({ ...warning, severity: 'warning' });
  return parsed.table;
}
