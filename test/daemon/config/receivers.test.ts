import { expect, it } from 'vitest';
import type { ConfigProblem } from '../../../daemon/config/configuration.ts';
import { readPulsarFile } from '../../../daemon/config/pulsarFile.ts';
import { createSectionReader } from '../../../daemon/config/sectionReader.ts';
import { isFault, parseToml } from '../../../daemon/config/tomlDocument.ts';
import { PULSAR } from '../../support/configurationFolder.ts';

function read(receivers: string) {
  const problems: ConfigProblem[] = [];
  const document = parseToml(`${PULSAR}\n${receivers}`);
  if (isFault(document)) throw new Error(document.message);
  const model = readPulsarFile(createSectionReader('pulsar.toml', document, problems));
  return { receivers: model?.receivers, problems: problems.map(({ message }) => message) };
}

it('offsets of receivers are read, at one site or everywhere', () => {
  const { receivers, problems } = read(`
[[receiver]]
name = "ridge-700"
site = "kestrel ridge"
offset_us = 350.5
uncertainty_us = 12
[[receiver]]
name = "annex-1400"
offset_us = -4
`);
  expect(problems).toEqual([]);
  expect(receivers).toEqual([
    { receiver: 'ridge-700', site: 'kestrel ridge', offsetUs: 350.5, uncertaintyUs: 12 },
    { receiver: 'annex-1400', offsetUs: -4, uncertaintyUs: 1 },
  ]);
  expect(read('').receivers).toBeUndefined();
});

it.each([
  ['[[receiver]]\nname = "a"', 'receiver 1, offset_us: is missing'],
  ['[[receiver]]\nname = "a"\noffset_ms = 1', 'receiver 1, offset_ms: unknown key; did you mean "offset_us"?'],
  ['[[receiver]]\nname = "a"\noffset_us = 1e9', 'receiver 1, offset_us: must be between -10000000 and 10000000 µs'],
  ['[[receiver]]\nname = "a"\noffset_us = 1\n[[receiver]]\nname = "a"\noffset_us = 2', 'receiver 2, name: is declared'],
  ['[receiver]\nname = "a"\noffset_us = 1', 'receiver: must be written with double brackets: [[receiver]]'],
])('%j is refused', (text, message) => {
  const { receivers, problems } = read(text);
  expect(receivers).toBeUndefined();
  expect(problems.some((problem) => problem.includes(message))).toBe(true);
});
