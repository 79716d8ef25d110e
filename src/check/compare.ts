/**
 * Answers whether two circuits do the same under a contract, how far they are apart, and on which input that shows.
 *
 * Road: dense. Both circuits are unfolded (`unfold.ts`) and reduced to what an observer sees (`observed.ts`): the
 * kept outputs as qubits, the bits of the original and the outputs declared measured as bits, everything else traced
 * out. The distance is that of `channel-distance.ts`; it is a proof up to its error bar.
 * Matching: as the caller says (`matching.ts`), else wires by number, or by the annotations of a narrowed circuit; bits by name, else by position. Extra wires of
 * the rewritten circuit start in |0> and are dropped.
 * Beyond dense size: the roads of `beyond-dense.ts`, which prove; then random product inputs (`probes.ts`, a proof of difference,
 * evidence of equality), else `undecided`.
 * Fails: InputError for circuits that cannot be matched.
 */
import type { BitExpression, Circuit } from '../circuit/circuit.ts';
import { contractOf, isProgram } from '../circuit/contract.ts';
import { type Contract, type ContractOptions, contractName } from '../contract.ts';
import { InputError } from '../input-error.ts';
import type { CompareReport } from '../reports.ts';
import { isAnnotated } from './annotations.ts';
import { type Answer, distances, type Question, undecided } from './answer.ts';
import { answerBeyondDense, sameByGates } from './beyond-dense.ts';
import { channelDistance } from './channel-distance.ts';
import {
  bitDistribution,
  DISTRIBUTION_BITS_MAX,
  distributionDistance,
  likeliestDifference,
} from './distribution.ts';
import { matched } from './matching.ts';
import { type Observation, observation } from './observation.ts';
import { type Observed, observe } from './observed.ts';
import { PROBES, probeOf } from './probes.ts';
import { findRelabelling } from './relabel.ts';
import { type Unfolded, unfold } from './unfold.ts';
import { whereTheyPart } from './where.ts';
import { findWitness } from './witness.ts';
import { WORST_CASE_ROWS_MAX, worstCaseDistance } from './worst-case.ts';

export type CompareOptions = {
  contract?: ContractOptions;
  /** On the distance D; default 1e-10. */
  tolerance?: number;
  /** Allow any permutation of the outputs. */
  relabel?: boolean;
  /** Which register is which, `a[0]=q[2], b=r`; by number (wires) and name (bits) otherwise. */
  map?: string;
  seed?: number;
};

export const COMPARE_TOLERANCE = 1e-10;

/** From here on matrices take seconds. */
const LARGE_WIRES = 9;

/** Beyond this many bits alone their distributions are compared, not a matrix for each outcome. */
const MATRIX_BITS_MAX = 12;

export function compareCircuits(
  original: Circuit,
  other: Circuit,
  {
    contract: asked = {},
    tolerance = COMPARE_TOLERANCE,
    relabel = false,
    map,
    seed = 1,
  }: CompareOptions = {},
): CompareReport & { unfoldedWires: number } {
  const rewritten = map === undefined ? other : matched(original, other, map);
  const contract = contractOf(original, asked);
  const head = {
    schema: 'wiregauge/compare@1',
    seed,
    contract: contractName(contract),
    contractFromFile: contract.decidedBy === 'file',
    seconds: 0,
    original: original.name,
    rewritten: rewritten.name,
  } as const;
  checkWires(original, rewritten, contract);
  const question = { original, rewritten, contract, tolerance, relabel, seed };
  const found = answerTo(question);
  const answer =
    map === undefined ? found : { ...found, notes: [`matched as asked: ${map}`, ...found.notes] };
  if (answer.verdict !== 'different') return { ...head, ...answer };
  return { ...head, ...answer, where: whereTheyPart(original, rewritten, contract) };
}

/** The first road that leads to an answer: dense; then proofs at any size; then probes. */
function answerTo(question: Question): Answer {
  try {
    // large matrices can be spared when nearly all gates are the same
    if (question.contract.inputs.length >= LARGE_WIRES) {
      const found = sameByGates(question);
      if (found) return found;
    }
    return denseAnswer(question);
  } catch (error) {
    if (!(error instanceof InputError) || error.code !== 'too-large') throw error;
    return (
      answerBeyondDense(question) ?? probeAnswer(question) ?? undecided(error.problems[0]!.message)
    );
  }
}

/** A difference on a random product input is a counterexample; none on several is evidence. */
function probeAnswer(question: Question): Answer | null {
  const { original, rewritten, contract, seed } = question;
  if (!contract.inputs.includes('any')) return null;
  let worst: Answer | null = null;
  try {
    for (let k = 0; k < PROBES; k++) {
      const probe = probeOf(original, rewritten, contract, seed, k);
      const answer = denseAnswer({ ...question, ...probe });
      if (answer.verdict === 'different') {
        const { witness } = answer;
        return {
          ...answer,
          method: 'probes',
          phase: null,
          witness: witness && { ...witness, input: probe.input },
          notes: ['a random product input tells the two apart; the distance is that on this input'],
        };
      }
      const size = (one: Answer | null): number => one?.distance?.hilbertSchmidt ?? -1;
      if (size(answer) > size(worst)) worst = answer;
    }
  } catch (error) {
    // one input at a time is too large as well: no probes
    if (error instanceof InputError && error.code === 'too-large') return null;
    throw error;
  }
  return (
    worst && {
      ...worst,
      method: 'probes',
      proof: false,
      phase: null,
      notes: [
        `the same on ${PROBES} random product inputs, which is no proof: a difference on fewer than about 1 in ${PROBES} such inputs, or below ${question.tolerance} on each, would have been missed`,
      ],
    }
  );
}

function denseAnswer({
  original,
  rewritten,
  contract,
  tolerance,
  relabel,
  seed,
}: Question): Answer {
  const a = unfold(original, contract);
  const b = unfold(rewritten, contract);
  const plan = observation(original, rewritten, contract);
  const looked = plan.of(a, 'original');
  if (isManyBits(looked, plan.kept.length, relabel)) {
    return compareBits(a, b, looked.bits, plan, tolerance);
  }
  const left = observe(a, looked, original.name);
  const relabelling = relabel ? findRelabelling(a, b, plan, left, rewritten.name, seed) : null;
  const right = observe(b, plan.of(b, 'rewritten', relabelling), rewritten.name);
  const gates = original.operations.length + rewritten.operations.length;
  const { hilbertSchmidt, phase, errorBar } = channelDistance(left, right, gates);
  const isSame = hilbertSchmidt <= tolerance;
  const notes: string[] = [];
  if (isSame && hilbertSchmidt > 100 * errorBar) {
    notes.push('the difference is above rounding, but within the tolerance');
  }
  const worstCase = worstCaseOf(left, right, plan, notes);
  return {
    verdict: isSame ? 'same' : 'different',
    distance: distances(hilbertSchmidt, errorBar, worstCase),
    phase,
    method: 'dense',
    proof: true,
    witness: isSame ? null : findWitness(left, right, plan.names, seed),
    relabelling,
    notes,
    unfoldedWires: b.unfoldedWires,
  };
}

/** Bits alone, and so many that one matrix for each of their strings would not fit. */
function isManyBits(
  looked: { bits: readonly BitExpression[]; anyInputs: readonly number[] },
  kept: number,
  relabel: boolean,
): boolean {
  const { length } = looked.bits;
  const isClassical = kept === 0 && looked.anyInputs.length === 0 && !relabel;
  return isClassical && length > MATRIX_BITS_MAX && length <= DISTRIBUTION_BITS_MAX;
}

function compareBits(
  a: Unfolded,
  b: Unfolded,
  bits: readonly BitExpression[],
  plan: Observation,
  tolerance: number,
): Answer {
  const p = bitDistribution(a, bits);
  const q = bitDistribution(b, plan.of(b, 'rewritten').bits);
  const hilbertSchmidt = distributionDistance(p, q);
  const isSame = hilbertSchmidt <= tolerance;
  return {
    verdict: isSame ? 'same' : 'different',
    distance: distances(hilbertSchmidt, null),
    phase: null,
    method: 'dense',
    proof: true,
    witness: isSame ? null : likeliestDifference(p, q, plan.names.bits),
    relabelling: null,
    notes: [],
    unfoldedWires: b.unfoldedWires,
  };
}

function checkWires(original: Circuit, rewritten: Circuit, contract: Contract): void {
  if (isAnnotated(rewritten) || rewritten.wires >= original.wires) return;
  const needed =
    contract.inputs.some((rule) => rule === 'any') || contract.outputs.includes('kept');
  if (!needed && isProgram(rewritten)) return;
  throw new InputError({
    code: 'fewer-wires',
    message: `expected ${original.wires} wires, or annotations that say which qubit enters and leaves where, got ${rewritten.wires} wires`,
    file: rewritten.name,
    hint: 'write @wiregauge.enters k before a reset and @wiregauge.leaves k before a measurement',
  });
}

function worstCaseOf(
  left: Observed,
  right: Observed,
  { names }: Observation,
  notes: string[],
): number | null {
  const [a] = left.outcomes.values();
  const [b] = right.outcomes.values();
  const d = 2 ** names.inputs.length;
  const isUnitary =
    names.bits.length === 0 && names.outputs.length === names.inputs.length && !names.hasZeroInputs;
  if (!isUnitary || a?.columns !== 1 || b?.columns !== 1) return null;
  if (d > WORST_CASE_ROWS_MAX) {
    notes.push(`the worst case is computed up to ${Math.log2(WORST_CASE_ROWS_MAX)} wires only`);
    return null;
  }
  return worstCaseDistance(a.matrix, b.matrix, d);
}
