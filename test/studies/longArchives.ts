// Forty years of many receivers:  npx tsx test/studies/longArchives.ts [SEED] [PULSARS]
// Three telescopes with receivers that follow each other, unknown offsets between them, gaps of months, start models fitted to the
// first year, positions slightly wrong, noise as published populations have it, glitches of 3e-11 to 2e-5.
import { writeFileSync } from 'node:fs';
import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { addSeconds, normalMjd, mjdNumber } from '../../detectors/time/mjd.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { type Dice, dice, simulateWalk } from '../support/simulatedPulsar.ts';
import { modelOf } from '../support/simulatedWatch.ts';

const seed = Number(process.argv[2] ?? 1);
const pulsars = Number(process.argv[3] ?? 20);
const only = process.argv[4] === undefined ? null : Number(process.argv[4]);
const EPOCH = 44_000;
const YEAR = 365.25;
const DAY = 86_400;

interface Glitch { t: number; rel: number; q: number; tau: number; rateRel: number }
interface Row { t: number; site: string; receiver: string; us: number; mhz: number }

const logUniform = (d: Dice, a: number, b: number) => Math.exp(Math.log(a) + d.uniform() * Math.log(b / a));

function schedule(d: Dice, errorUs: number): Row[] {
  const rows: Row[] = [];
  const scopes = [
    { site: 'north', from: 0, to: 40 },
    { site: 'east', from: 10 + 5 * d.uniform(), to: 25 + 10 * d.uniform() },
    { site: 'south', from: 25 + 5 * d.uniform(), to: 40 },
  ];
  if (d.uniform() < 0.5) scopes.splice(1, 1);
  for (const s of scopes) {
    const cadence = logUniform(d, 4, 40);
    const receivers = 2 + Math.floor(4 * d.uniform());
    let t = s.from * YEAR;
    let gapLeft = 0;
    while (t < s.to * YEAR) {
      const k = Math.min(receivers - 1, Math.floor(((t / YEAR - s.from) / (s.to - s.from)) * receivers));
      rows.push({ t, site: s.site, receiver: `r${k}`, us: errorUs * logUniform(d, 0.6, 1.7) * (k === 0 ? 3 : 1), mhz: [1400, 1400, 600][Math.floor(3 * d.uniform())]! });
      t += cadence * (0.2 + 1.6 * d.uniform());
      if (d.uniform() < 0.004) t += 60 + 400 * d.uniform();
      void gapLeft;
    }
  }
  return rows.sort((a, b) => a.t - b.t);
}

function follow(d: Dice) {
  for (let i = 0; i < 20; i++) d.uniform();
  const msp = d.uniform() < 0.1;
  const nu = msp ? logUniform(d, 80, 600) : logUniform(d, 0.4, 12);
  const nudot = msp ? -logUniform(d, 1e-16, 3e-15) : -nu * nu * logUniform(d, 1e-17, 1e-12 / nu) ;
  const prior = noisePrior(nu, nudot);
  const draw = (p: { median: number; lnScatter: number }) => p.median * Math.exp(p.lnScatter * d.normal());
  const which = d.uniform();
  const walks = {
    phaseWalk: d.uniform() < 0.2 ? draw(prior.phaseWalk) : 0,
    frequencyWalk: which < 0.6 ? draw(prior.frequencyWalk) : 0,
    torqueWalk: which > 0.4 ? draw(prior.torqueWalk) : 0,
  };
  const errorUs = msp ? logUniform(d, 1, 20) : logUniform(d, 40, 2000);
  const rows = schedule(d, errorUs);
  const scale = logUniform(d, 0.8, 2);
  const offsets = new Map<string, number>();
  for (const r of rows) {
    const name = `${r.site}|${r.receiver}`;
    if (!offsets.has(name)) offsets.set(name, offsets.size === 0 ? 0 : logUniform(d, 1e-5, 0.05) * (d.uniform() < 0.5 ? -1 : 1));
  }
  const glitches: Glitch[] = [];
  if (!msp && d.uniform() < 0.6) {
    const n = 1 + Math.floor(3 * d.uniform());
    for (let i = 0; i < n; i++) {
      const rel = d.uniform() < 0.55 ? logUniform(d, 3e-11, 3e-8) : logUniform(d, 1e-7, 1e-5);
      glitches.push({ t: (2 + 37 * d.uniform()) * YEAR, rel, q: d.uniform() < 0.4 ? logUniform(d, 0.003, 0.5) : 0, tau: logUniform(d, 10, 300), rateRel: logUniform(d, 1e-4, 2e-2) });
    }
    glitches.sort((a, b) => a.t - b.t);
    for (let i = glitches.length - 1; i > 0; i--) if (glitches[i]!.t - glitches[i - 1]!.t < 300) glitches.splice(i, 1);
  }
  const positionTurns = logUniform(d, 0.003, 0.3) * 2.4e-3 * nu * (msp ? 0.003 : 1);
  const motionTurns = logUniform(d, 0.5, 20) * 1e-3 * 2.4e-3 * nu * (msp ? 0.01 : 1);
  const phase0 = 6.28 * d.uniform();
  const dm = 1e-3 * d.normal();
  const walk = simulateWalk(rows.map((r) => r.t), walks, d);
  const glitchTurns = (t: number) => {
    let s = 0;
    for (const g of glitches) {
      const dt = t - g.t;
      if (dt <= 0) continue;
      const f = g.rel * nu * DAY;
      s -= f * (1 - g.q) * dt + f * g.q * g.tau * (1 - Math.exp(-dt / g.tau)) + 0.5 * g.rateRel * nudot * DAY * DAY * dt * dt;
    }
    return s;
  };
  let bad = 0;
  const deviation = rows.map((r, i) => {
    const out = d.uniform() < 0.01;
    if (out) bad++;
    return walk[i]! + glitchTurns(r.t) + (positionTurns + motionTurns * (r.t / YEAR)) * Math.sin((2 * Math.PI * r.t) / YEAR + phase0) +
      nu * (offsets.get(`${r.site}|${r.receiver}`)! + (dm / 2.41e-4) * 1 / (r.mhz * r.mhz)) + (out ? d.uniform() : scale * r.us * 1e-6 * nu * d.normal());
  });
  // The start model is fitted to the first year: takes a straight line and a parabola off.
  const first = rows.flatMap((r, i) => (r.t < YEAR || i < 12 ? [i] : []));
  const fit = parabola(first.map((i) => rows[i]!.t), first.map((i) => deviation[i]!), Math.abs(nudot) * DAY * DAY / 2);
  const model = modelOf({ name: `KR ${Math.floor(1e4 * d.uniform())}`, frequencyHz: nu.toFixed(13), frequencyDerivativeHzPerS: nudot, epochMjd: EPOCH });
  const phaseAt = phaseEvaluator(model);
  const watch = startWatch(model, detectorSettings(1, 560));
  const from = performance.now();
  let notLocked = 0;
  rows.forEach((r, i) => {
    const near = normalMjd(EPOCH, r.t);
    const onTurn = addSeconds(near, -phaseAt(near).deviationTurns / nu);
    const dev = deviation[i]! - fit[0] - fit[1] * r.t - fit[2] * r.t * r.t;
    advance(watch, { key: String(i), tdb: addSeconds(onTurn, dev / nu), uncertaintyUs: r.us, frequencyMhz: r.mhz, site: r.site, receiver: r.receiver, pulseNumber: null });
    if (!watch.locked) notLocked++;
  });
  if (process.env['TRACE']) for (const e of report(watch).events) console.log(e.state, e.explanation, ((e.epochMjd - EPOCH)/YEAR).toFixed(3), "conf", e.confirmedAtMjd === null ? null : ((e.confirmedAtMjd-EPOCH)/YEAR).toFixed(3), "dnu/nu", e.deltaNuOverNu?.toExponential(3), "BF", e.logBayesFactor.toFixed(1), JSON.stringify(e.explanations), e.aliases.length);
  if (process.env['TRACE']) console.log(glitches.map((g) => ({...g, t: g.t/YEAR})), walks, watch.noise);
  const events = report(watch).events.filter((e) => e.state === 'confirmed');
  const ms = performance.now() - from;
  const matched = new Set<number>();
  const wrong: string[] = [];
  const found = glitches.map((g) => {
    const gapAfter = rows.find((r) => r.t > g.t)?.t ?? 1e9;
    const gapBefore = [...rows].reverse().find((r) => r.t < g.t)?.t ?? 0;
    const k = events.findIndex((e, j) => !matched.has(j) && Math.abs(e.epochMjd - EPOCH - g.t) < Math.max(40, 2 * (gapAfter - gapBefore)));
    if (k >= 0) matched.add(k);
    const e = events[k];
    // Phase that the step makes in 100 d against error and noise: a rough significance.
    const noise = Math.sqrt((scale * errorUs * 1e-6 * nu) ** 2 + walks.frequencyWalk * 1e6 / 3 + walks.torqueWalk * 1e10 / 20);
    return { rel: g.rel, snr: (g.rel * nu * DAY * 100) / noise, found: e ? `${e.explanation} ${(e.deltaNuOverNu ?? 0).toExponential(2)}` : '-' };
  });
  events.forEach((e, j) => { if (!matched.has(j)) wrong.push(`${e.explanation} ${(e.deltaNuOverNu ?? 0).toExponential(2)} at ${((e.epochMjd - EPOCH) / YEAR).toFixed(2)}y odds ${e.logBayesFactor.toFixed(1)}`); });
  const states = { locked: watch.locked, notLocked, n: rows.length, receivers: offsets.size, ms: Math.round(ms), nu: +nu.toPrecision(4), nudot: +nudot.toPrecision(3), us: Math.round(errorUs), setAside: report(watch).arrivals.filter((a) => a.fate !== 'used').length, bad, size: watch.states.size };
  return { states, found, wrong, years: (rows.at(-1)!.t - rows[0]!.t) / YEAR };
}

function parabola(x: number[], y: number[], _c: number): [number, number, number] {
  const s = x.at(-1)! || 1;
  const a = [[0, 0, 0, 0], [0, 0, 0, 0], [0, 0, 0, 0]];
  x.forEach((v, i) => {
    const b = [1, v / s, (v / s) ** 2];
    for (let r = 0; r < 3; r++) { for (let c = 0; c < 3; c++) a[r]![c]! += b[r]! * b[c]!; a[r]![3]! += b[r]! * y[i]!; }
  });
  for (let p = 0; p < 3; p++) for (let r = 0; r < 3; r++) if (r !== p) { const f = a[r]![p]! / a[p]![p]!; for (let c = p; c < 4; c++) a[r]![c]! -= f * a[p]![c]!; }
  return [a[0]![3]! / a[0]![0]!, a[1]![3]! / a[1]![1]! / s, a[2]![3]! / a[2]![2]! / (s * s)];
}

let years = 0, wrong = 0, hit = 0, big = 0, bigHit = 0, wrongPulsars = 0;
for (let n = 0; n < pulsars; n++) {
  if (only !== null && n !== only) continue;
  const r = follow(dice(seed + n * 7919));
  years += r.years; wrong += r.wrong.length; if (r.wrong.length) wrongPulsars++;
  for (const f of r.found) { const good = f.found.includes('glitch'); if (good) hit++; if (f.snr > 20) { big++; if (good) bigHit++; } }
  console.log(n, JSON.stringify(r.states), r.found.map((f) => `[${f.rel.toExponential(2)} snr ${f.snr.toFixed(1)} → ${f.found}]`).join(' '), r.wrong.length ? `WRONG: ${r.wrong.join('; ')}` : '');
}
console.log({ years: Math.round(years), wrong, wrongPulsars, hit, big, bigHit });
void mjdNumber; void writeFileSync;
