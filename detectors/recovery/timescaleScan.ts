import { logSumExp } from '../math/logSumExp.ts';
import type { EventFrame } from './eventFrame.ts';
import { type GapSystem, recoveryColumn } from './gapSystem.ts';
import { explore, type GlitchPoint, type PointCloud } from './glitchPosterior.ts';
import type { SizeScale } from './sizePrior.ts';

/** Shortest recovery looked for, days. */
const SHORTEST_DAYS = 0.5;
const FIRST_NODES = 14;
const MOST_NODES = 44;
/** Gaps and rungs of the prior lighter than this after the first nodes are dropped, nats. */
const HOPELESS = 14;

interface Node {
  readonly lnTimescale: number;
  readonly clouds: readonly PointCloud[];
  readonly logEvidence: number;
}

/**
 * The posterior with one exponential: nodes evenly spaced in ln τ (its prior is flat there) from half a day, or half the
 * spacing of the first arrivals after the event, to three times the span after it; then every interval in which the
 * evidence changes by more than a little, near its maximum, is halved.
 */
export function scanTimescales(
  frame: EventFrame,
  systems: readonly GapSystem[],
  scales: readonly SizeScale[],
): { readonly points: GlitchPoint[]; readonly logEvidence: number } {
  const { low, high } = timescaleRange(frame, systems);
  const evaluate = (lnTimescale: number, from: readonly GapSystem[], rungs: readonly SizeScale[]): Node => {
    const clouds = from.map((system) =>
      explore(frame, system, recoveryColumn(frame, system, Math.exp(lnTimescale)), rungs),
    );
    return { lnTimescale, clouds, logEvidence: logSumExp(clouds.map((cloud) => cloud.logEvidence)) };
  };
  const nodes = Array.from({ length: FIRST_NODES }, (_, i) =>
    evaluate(low + ((high - low) * i) / (FIRST_NODES - 1), systems, scales),
  );
  const best = Math.max(...nodes.map(({ logEvidence }) => logEvidence));
  const hopeful = systems.filter((_, g) => nodes.some(({ clouds }) => clouds[g]!.logEvidence > best - HOPELESS));
  while (nodes.length < MOST_NODES) {
    const at = roughestInterval(nodes);
    if (at === null) break;
    const middle = 0.5 * (nodes[at]!.lnTimescale + nodes[at + 1]!.lnTimescale);
    nodes.splice(at + 1, 0, evaluate(middle, hopeful, scales));
  }
  return integrate(nodes, high - low);
}

function timescaleRange(frame: EventFrame, systems: readonly GapSystem[]): { low: number; high: number } {
  const { arrivals } = frame;
  const first = systems[0]!.gap.after;
  const span = arrivals.at(-1)!.tDays - arrivals[first]!.tDays;
  const spacing = (arrivals[first + 1]?.tDays ?? arrivals[first]!.tDays) - arrivals[first]!.tDays;
  const low = Math.max(SHORTEST_DAYS, 0.5 * spacing);
  return { low: Math.log(low), high: Math.log(Math.max(3 * span, 4 * low)) };
}

/** The interval, near the maximum, over which the evidence changes most; null when all are resolved. */
function roughestInterval(nodes: readonly Node[]): number | null {
  const best = Math.max(...nodes.map(({ logEvidence }) => logEvidence));
  let roughest: number | null = null;
  let largest = 0.5;
  for (let i = 0; i + 1 < nodes.length; i++) {
    const left = nodes[i]!;
    const right = nodes[i + 1]!;
    if (Math.max(left.logEvidence, right.logEvidence) < best - 6) continue;
    if (right.lnTimescale - left.lnTimescale < 2e-3) continue;
    const change = Math.min(10, Math.abs(left.logEvidence - right.logEvidence));
    if (change > largest) {
      largest = change;
      roughest = i;
    }
  }
  return roughest;
}

/** Trapezoidal rule in ln τ under a flat prior there. */
function integrate(nodes: readonly Node[], range: number): { points: GlitchPoint[]; logEvidence: number } {
  const logWeights = nodes.map(({ lnTimescale }, i) => {
    const left = nodes[Math.max(i - 1, 0)]!.lnTimescale;
    const right = nodes[Math.min(i + 1, nodes.length - 1)]!.lnTimescale;
    return Math.log((0.5 * (right - left)) / range);
  });
  const logEvidence = logSumExp(nodes.map((node, i) => node.logEvidence + logWeights[i]!));
  const points = nodes.flatMap(({ clouds }, i) =>
    clouds.flatMap((cloud) => cloud.points.map((point) => ({ ...point, logMass: point.logMass + logWeights[i]! }))),
  );
  return { points, logEvidence };
}
