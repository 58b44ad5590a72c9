import { logSumExp } from '../math/logSumExp.ts';
import type { EventFrame } from './eventFrame.ts';
import { type GapSystem, recoveryColumn } from './gapSystem.ts';
import { explore, type GlitchPoint, type PointCloud } from './glitchPosterior.ts';
import type { SizeScale } from './sizePrior.ts';

/** Shortest recovery looked for, days. */
const SHORTEST_DAYS = 0.5;
const FIRST_NODES = 14;
const MOST_NODES = 44;
/** Neighbouring nodes may differ by so many nats near the maximum. */
const SMOOTH = 0.5;
/** Nodes so many nats below the maximum need no neighbours. */
const NEAR_MAXIMUM = 6;
const CLOSEST = 1e-3;

interface Node {
  readonly lnTimescale: number;
  readonly cloud: PointCloud;
}

/**
 * The posterior of a glitch in one gap with one exponential: nodes evenly spaced in ln τ, where the prior is flat, from
 * half a day, half the spacing of the first arrivals after the event, or a third of the gap, to three times the span after it; then every
 * interval near the maximum over which the evidence changes by more than a little is halved.
 */
export function scanTimescales(frame: EventFrame, system: GapSystem, scales: readonly SizeScale[]): PointCloud {
  const { low, high } = timescaleRange(frame, system);
  const evaluate = (lnTimescale: number): Node => ({
    lnTimescale,
    cloud: explore(frame, system, recoveryColumn(frame, system, Math.exp(lnTimescale)), scales),
  });
  const nodes = Array.from({ length: FIRST_NODES }, (_, i) => evaluate(low + ((high - low) * i) / (FIRST_NODES - 1)));
  while (nodes.length < MOST_NODES) {
    const at = roughestInterval(nodes);
    if (at === null) break;
    nodes.splice(at + 1, 0, evaluate(0.5 * (nodes[at]!.lnTimescale + nodes[at + 1]!.lnTimescale)));
  }
  return integrate(nodes, high - low);
}

/** A decay much quicker than the gap is over before it is seen: what it leaves is a step in phase, which noise imitates. */
const SHORTEST_OF_GAP = 1 / 3;

function timescaleRange({ arrivals }: EventFrame, { gap }: GapSystem): { low: number; high: number } {
  const first = arrivals[gap.after]!.tDays;
  const span = arrivals.at(-1)!.tDays - first;
  const spacing = (arrivals[gap.after + 1]?.tDays ?? first) - first;
  const low = Math.max(SHORTEST_DAYS, 0.5 * spacing, SHORTEST_OF_GAP * gap.lengthDays);
  return { low: Math.log(low), high: Math.log(Math.max(3 * span, 4 * low)) };
}

/** The interval, near the maximum, over which the evidence changes most; null when all are resolved. */
function roughestInterval(nodes: readonly Node[]): number | null {
  const best = Math.max(...nodes.map(({ cloud }) => cloud.logEvidence));
  let roughest: number | null = null;
  let largest = SMOOTH;
  for (let i = 0; i + 1 < nodes.length; i++) {
    const left = nodes[i]!;
    const right = nodes[i + 1]!;
    const higher = Math.max(left.cloud.logEvidence, right.cloud.logEvidence);
    if (higher < best - NEAR_MAXIMUM || right.lnTimescale - left.lnTimescale < CLOSEST) continue;
    const change = Math.abs(left.cloud.logEvidence - right.cloud.logEvidence);
    if (change > largest) {
      largest = change;
      roughest = i;
    }
  }
  return roughest;
}

/** Trapezoidal rule in ln τ. */
function integrate(nodes: readonly Node[], range: number): PointCloud {
  const logWeights = nodes.map((_, i) => {
    const left = nodes[Math.max(i - 1, 0)]!.lnTimescale;
    const right = nodes[Math.min(i + 1, nodes.length - 1)]!.lnTimescale;
    return Math.log((0.5 * (right - left)) / range);
  });
  return {
    logEvidence: logSumExp(nodes.map(({ cloud }, i) => cloud.logEvidence + logWeights[i]!)),
    points: nodes.flatMap(({ cloud }, i) =>
      cloud.points.map((point): GlitchPoint => ({ ...point, logMass: point.logMass + logWeights[i]! })),
    ),
  };
}
