import { defineConfig } from 'vitest/config';
import { BaseSequencer, type TestSpecification } from 'vitest/node';

/** The whole program first: those files take longest, so that both workers end together. */
class ProgramFirst extends BaseSequencer {
  override async sort(files: TestSpecification[]): Promise<TestSpecification[]> {
    const isOfProgram = ({ moduleId }: TestSpecification) => moduleId.includes('/test/program/');
    const sorted = await super.sort(files);
    return [...sorted.filter(isOfProgram), ...sorted.filter((file) => !isOfProgram(file))];
  }
}

// Whole-program tests start real processes; two files at a time keep a two-core machine honest. The files of a worker share its loaded modules:
// loading them anew for each file took as long as all unit tests together. So a test leaves no module, clock or environment changed behind it.
export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    testTimeout: 60_000,
    maxWorkers: 2,
    isolate: false,
    sequence: { sequencer: ProgramFirst },
  },
});
