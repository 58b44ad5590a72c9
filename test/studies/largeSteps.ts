import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { addSeconds, normalMjd } from '../../detectors/time/mjd.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { type Dice, dice, simulateWalk } from '../support/simulatedPulsar.ts';
import { modelOf } from '../support/simulatedWatch.ts';
const seed = Number(process.argv[2] ?? 1), count = Number(process.argv[3] ?? 40), only = process.argv[4];
const EPOCH = 52_000, YEAR = 365.25, DAY = 86400;
const lu = (d: Dice, a: number, b: number) => Math.exp(Math.log(a) + d.uniform() * Math.log(b / a));
let good = 0, alias = 0, missed = 0, extra = 0, clean = 0; const t0 = performance.now();
for (let n = Number(process.env["FROM"] ?? 0); n < count; n++) {
  if (only !== undefined && n !== Number(only)) continue;
  const d = dice(seed + n * 7919); for (let i = 0; i < 20; i++) d.uniform();
  const nu = lu(d, 1, 20), nudot = -lu(d, 3e-15, 1e-12) * nu;
  const prior = noisePrior(nu, nudot);
  const f = Math.exp(d.normal() * 1.5), g = Math.exp(d.normal() * 1.5);
  const walks = { phaseWalk: 0, frequencyWalk: prior.frequencyWalk.median * f * (d.uniform() < .6 ? 1 : 0), torqueWalk: prior.torqueWalk.median * g * (d.uniform() < .6 ? 1 : 0) };
  const us = lu(d, 40, 1500), cadence = lu(d, 3, 40);
  const rel = lu(d, 1e-7, 1e-5), q = d.uniform() < .6 ? lu(d, .003, rel > 1e-6 ? .05 : .2) : 0, tau = lu(d, 10, 300), rateRel = lu(d, 1e-4, 2e-2), t1 = (3 + 2 * d.uniform()) * YEAR;
  const days: number[] = []; for (let t = 0; t < 9 * YEAR; t += cadence * (.2 + 1.6 * d.uniform())) days.push(t);
  const walk = simulateWalk(days, walks, d);
  const model = modelOf({ frequencyHz: nu.toFixed(13), frequencyDerivativeHzPerS: nudot, epochMjd: EPOCH });
  const phaseAt = phaseEvaluator(model); const watch = startWatch(model, detectorSettings(1, 560));
  days.forEach((t, i) => {
    const dt = t - t1, F = rel * nu * DAY;
    const gl = dt > 0 ? -(F * (1 - q) * dt + F * q * tau * (1 - Math.exp(-dt / tau)) + .5 * rateRel * nudot * DAY * DAY * dt * dt) : 0;
    const near = normalMjd(EPOCH, t); const on = addSeconds(near, -phaseAt(near).deviationTurns / nu);
    const dev = walk[i]! + gl + (d.uniform() < .01 ? d.uniform() : us * 1e-6 * nu * d.normal());
    advance(watch, { key: String(i), tdb: addSeconds(on, dev / nu), uncertaintyUs: us, frequencyMhz: 1400, site: 'a', receiver: 'b', pulseNumber: null });
  });
  const events = report(watch).events.filter((e) => e.state === 'confirmed');
  const near = events.filter((e) => Math.abs(e.epochMjd - EPOCH - t1) < 2.5 * cadence + 10);
  const hit = near.find((e) => e.explanation === 'glitch' && Math.abs((e.deltaNuOverNu ?? 0) / rel - 1) < .1);
  const listed = near.some((e) => e.aliases.some((a) => Math.abs(a.deltaNuHz / nu / rel - 1) < .1));
  const others = events.filter((e) => e !== (hit ?? near[0]));
  if (hit) good++; else if (listed) alias++; else missed++; extra += others.length; if (hit && !others.length) clean++;
  if (!hit || others.length || only) console.log(n, { nu: +nu.toFixed(2), nudot: nudot.toExponential(1), cadence: +cadence.toFixed(1), us: Math.round(us), rel: rel.toExponential(2), turnsPerGap: +(rel * nu * DAY * cadence).toFixed(1), q: +q.toFixed(3), tau: Math.round(tau), noise100: +Math.sqrt(walks.frequencyWalk * 1e6 / 3 + walks.torqueWalk * 1e10 / 20).toFixed(3), t1: (t1 / YEAR).toFixed(2), locked: watch.locked }, hit ? 'HIT' : listed ? 'ALIAS' : 'MISS', events.map((e) => `${e.explanation} ${(e.deltaNuOverNu ?? 0).toExponential(2)} @${((e.epochMjd - EPOCH) / YEAR).toFixed(2)}`).join('; '));
}
console.log({ good, alias, missed, extra, clean, s: Math.round((performance.now() - t0) / 1000) });
