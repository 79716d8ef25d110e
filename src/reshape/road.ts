/**
 * Chooses how a circuit is to be narrowed, or says why it cannot be.
 *
 * Order: what structure gives stands, unless windows or the matrix allow fewer wires and these are wanted; then windows of a
 * few gates where they do as well as the matrix of the whole (they leave all other gates as they are), else the chain of
 * blocks along the causal order; then, for kept outputs, the nearest chain within the tolerance. What is left
 * is impossible, with a bound, or, where no matrix could be had, undecided.
 */
import { type Circuit, wireName } from '../circuit/circuit.ts';
import { type Contract, contractName } from '../contract.ts';
import { distanceFromInfidelity } from '../numeric/distance.ts';
import { bestAt } from '../plan/frontier.ts';
import type { NarrowedCircuit } from '../plan/structure.ts';
import { planStructure, type StructurePlan } from '../plan/structure-plan.ts';
import { planWindows, type Window } from '../plan/windows.ts';
import { INFLUENCE_WIRES_MAX } from '../survey/influence.ts';
import {
  type Attempt,
  attemptChain,
  type CausalWidth,
  causalWidth,
  type Question,
  shortfall,
} from './causal-width.ts';
import type { ChainPlan } from './chain.ts';
import { unitaryOf } from './unitary-part.ts';

/** Windows of this many wires are looked for in larger circuits only. */
const WINDOW_WIRES = 4;
/** Longer circuits would be searched for minutes. */
const WINDOW_OPERATIONS_MAX = 4000;

export type Bracket = { lower: number; reached: number | null };

export type Road =
  | { kind: 'structure'; reason: string; narrowed: NarrowedCircuit }
  | { kind: 'windows'; reason: string; plan: StructurePlan; windows: readonly Window[] }
  | { kind: 'chain'; reason: string; question: Question; attempt: Attempt; bracket: Bracket }
  | { kind: 'feed-forward'; reason: string; question: Question; plan: ChainPlan; width: number }
  | { kind: 'impossible'; reason: string; bracket: Bracket | null }
  | { kind: 'undecided'; reason: string; bracket: Bracket | null };

export type Wish = {
  circuit: Circuit;
  contract: Contract;
  /** Number of wires wanted; undefined: the fewest. */
  wires: number | undefined;
  /** On the distance D. */
  tolerance: number;
  stopped(): boolean;
  /** Windows have been tried, and did not come to anything. */
  withoutWindows?: boolean;
};

export function chooseRoad(wish: Wish): Road {
  const { circuit, wires: wanted } = wish;
  const n = circuit.wires;
  const plan = planStructure(circuit, wish.contract);
  const { narrowed } = bestAt(plan, wanted ?? plan.width.width);
  const structural = narrowed.circuit.wires;
  if (wanted !== undefined && structural <= wanted) return byStructure(narrowed, n);
  const u = structural > 1 ? unitaryOf(circuit, INFLUENCE_WIRES_MAX) : null;
  if (!u) {
    const windows = windowsFor(wish, plan, structural);
    return windows && windows.width <= (wanted ?? structural - 1)
      ? byWindows(plan, windows, structural, null)
      : withoutMatrix(wish, narrowed);
  }
  const measured = wish.contract.outputs.map((rule) => rule === 'measured');
  const question = { u, wires: n, measured, stopped: wish.stopped };
  const causal = causalWidth(question);
  const goal = wanted ?? causal.width;
  if (causal.width < structural && causal.width <= goal) {
    const windows = windowsFor(wish, plan, structural);
    if (windows && windows.width <= goal) return byWindows(plan, windows, structural, causal.width);
    // feed-forward only where it saves wires
    const asKept = { ...question, measured: measured.map(() => false) };
    const quantum = measured.includes(true) ? causalWidth(asKept) : causal;
    const isEnough = quantum.width <= Math.max(causal.width, wanted ?? 0);
    const road = isEnough
      ? byChain(asKept, quantum, structural)
      : byFeedForward(question, causal, structural);
    const nearly = windows ? `; windows of a few gates alone come to ${windows.width}` : '';
    return { ...road, reason: road.reason + nearly };
  }
  const nearest = measured.includes(true)
    ? null
    : withinTolerance(wish, question, causal, Math.min(structural, causal.width));
  if (nearest?.kind === 'chain') return nearest;
  if (wanted === undefined && structural < n) return byStructure(narrowed, n);
  return nearest ?? impossibleMeasured(wish, causal);
}

type Windows = { windows: readonly Window[]; width: number };

/** Windows with which the circuit needs fewer wires than its structure does; null where there are none. */
function windowsFor(
  { circuit, withoutWindows = false, stopped }: Wish,
  plan: StructurePlan,
  structural: number,
): Windows | null {
  const isWorthIt = circuit.wires > WINDOW_WIRES && circuit.operations.length <= WINDOW_OPERATIONS_MAX; // biome-ignore format: one condition
  if (withoutWindows || structural <= 1 || !isWorthIt) return null;
  const { windows, width } = planWindows(plan, { stopped });
  return windows.length > 0 && width.width < structural ? { windows, width: width.width } : null;
}

/** `dense`: what the matrix of the whole allows, where it is known. */
function byWindows(
  plan: StructurePlan,
  { windows, width }: Windows,
  structural: number,
  dense: number | null,
): Road {
  const where = windows.length === 1 ? 'one window' : `${windows.length} windows`;
  const order = `the order of the gates needs ${count(structural)}`;
  const whole =
    dense === null ? '' : dense === width ? ', as few as that of the whole' : `; that of the whole allows ${dense}`; // biome-ignore format: one choice
  const reason = `${order}, but the influence in ${where} of a few gates allows ${width}${whole}`;
  return { kind: 'windows', reason, plan, windows };
}

function byStructure(narrowed: NarrowedCircuit, before: number): Road {
  const { wires } = narrowed.circuit;
  const reason =
    wires < before
      ? `the order of the gates alone allows ${count(wires)} instead of ${before}`
      : `the circuit has ${count(wires)} as it is`;
  return { kind: 'structure', reason, narrowed };
}

function withoutMatrix({ circuit, wires: wanted }: Wish, narrowed: NarrowedCircuit): Road {
  const { wires } = narrowed.circuit;
  if (wanted === undefined && wires < circuit.wires) return byStructure(narrowed, circuit.wires);
  if (wires === 1 && circuit.wires === 1) {
    const reason = 'a circuit of one wire cannot be narrowed';
    return { kind: 'impossible', reason, bracket: null };
  }
  const why =
    circuit.wires > INFLUENCE_WIRES_MAX
      ? `its matrix is too large to decide more (${INFLUENCE_WIRES_MAX} wires is the limit here)`
      : 'it measures, resets or decides on the way, so it has no matrix that could decide more';
  const reason = `reordering the gates needs ${count(wires)}, and ${why}`;
  return { kind: 'undecided', reason, bracket: null };
}

function openingReason(structural: number, width: number): string {
  const order = `the order of the gates needs ${count(structural)}`;
  return `${order}, but the influence of inputs on outputs allows ${width}`;
}

function byChain(question: Question, { plan, width }: CausalWidth, structural: number): Road {
  const attempt = attemptChain(question, plan);
  const bracket = { lower: 0, reached: attempt.distance };
  const reason = openingReason(structural, width);
  return { kind: 'chain', reason, question, attempt, bracket };
}

function byFeedForward(question: Question, { plan, width }: CausalWidth, structural: number): Road {
  const reason = `${openingReason(structural, width)} when bits are measured as early as can be`;
  return { kind: 'feed-forward', reason, question, plan, width };
}

/** Fewer wires than any exact circuit has: the nearest chain if it is near enough, else the bracket. */
function withinTolerance(
  { circuit, contract, wires: wanted, tolerance }: Wish,
  question: Question,
  { table, width }: CausalWidth,
  exact: number,
): Road | null {
  const { u, wires: n } = question;
  let best: Road | null = null;
  let refusal: Road | null = null;
  for (let fewer = wanted ?? exact - 1; fewer >= 1; fewer--) {
    const { infidelity, leaves, enters, plan } = shortfall(u, n, fewer, table);
    const lower = distanceFromInfidelity(infidelity);
    const attempt = attemptChain(question, plan, 0.01 * tolerance);
    const bracket = { lower, reached: attempt.distance };
    if (attempt.distance <= tolerance) {
      const reason =
        `within the tolerance of ${tolerance} the influence of inputs on outputs allows ` +
        count(fewer);
      best = { kind: 'chain', reason, question, attempt, bracket };
    } else if (!best) {
      const pair = `${wireName(circuit, leaves)} leave before ${wireName(circuit, enters)} enters`;
      const how = `any attempt is wrong by at least ${figures(infidelity)} in process infidelity`;
      const exactly =
        contractName(contract) === 'any/kept'
          ? `no equal circuit has fewer than ${count(width)}`
          : `no circuit that is equal for every input has fewer than ${count(width)}`;
      const reason =
        fewer === exact - 1
          ? `${exactly}: none lets ${pair}; ${how}`
          : `${exactly}, and ${count(fewer)} are wanted: ${how}`;
      const reached = `; the nearest circuit found is at D = ${figures(attempt.distance)}`;
      refusal = {
        // between the bound and the nearest found lies what is not known
        kind: lower <= tolerance ? 'undecided' : 'impossible',
        reason: reason + reached,
        bracket,
      };
    }
    if (wanted !== undefined || attempt.distance > tolerance) break;
  }
  return best ?? refusal;
}

function impossibleMeasured({ circuit, contract, wires: wanted }: Wish, causal: CausalWidth): Road {
  const n = circuit.wires;
  const { table, width } = causal;
  const weakest = leastOpen(table, n);
  const scope = contract.inputs.includes('any')
    ? `no equal circuit has fewer than ${count(width)}`
    : `neither reordering nor any circuit that is equal for every input has fewer than ${count(width)}`;
  const wish = wanted !== undefined && wanted < width ? `, and ${count(wanted)} are wanted` : '';
  const { leaves, enters, value } = weakest;
  const kind =
    contract.outputs[leaves] === 'measured'
      ? 'in the probability of its bit'
      : 'in process infidelity';
  const pair = `letting ${wireName(circuit, leaves)} leave before ${wireName(circuit, enters)} enters`;
  const reason = `${scope}${wish}: even ${pair} is wrong by at least ${figures(value)} ${kind}`;
  return { kind: 'impossible', reason, bracket: null };
}

/** The least entry of the table that is not rounding. */
function leastOpen(
  table: Float64Array,
  n: number,
): { leaves: number; enters: number; value: number } {
  let best = { leaves: 0, enters: 0, value: Number.POSITIVE_INFINITY };
  table.forEach((value, at) => {
    const isOpen = value > 1e-10;
    if (isOpen && value < best.value) best = { leaves: Math.floor(at / n), enters: at % n, value };
  });
  return best;
}

function count(wires: number): string {
  return wires === 1 ? '1 wire' : `${wires} wires`;
}

/** A number to four figures, as people write it. */
export function figures(value: number): string {
  return value === 0 ? '0' : `${Number(value.toPrecision(4))}`;
}
