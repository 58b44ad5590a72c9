import { createObservatory } from './observatory.ts';
import { syntheticPulsar, syntheticArrivals, arrivalFile } from './syntheticPulsar.ts';
const p = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61000, glitches: [{ mjd: 61360, deltaNuOverNu: 2e-7 }] });
const q = syntheticPulsar({ name: 'KR 1', epochMjd: 61000 });
const o = await createObservatory({ pulsars: [p, q] });
const a = syntheticArrivals(p, { fromMjd: 61001, toMjd: 61370, everyDays: 3, seed: 1 });
const b = syntheticArrivals(q, { fromMjd: 61001, toMjd: 61370, everyDays: 3, seed: 2 });
for (let i = 0; i < 5; i++) await o.drop(`f${i}.csv`, arrivalFile([...a.slice(i*25, i*25+25), ...b.slice(i*25, i*25+25)]));
console.log(o.folder);
