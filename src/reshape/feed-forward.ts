/**
 * Factors a unitary into blocks when some outputs are measured as they leave: later blocks may depend on
 * the bits.
 *
 * Method: only the projectors of a measured output need to be local, U = (sum_a |a><a| x V_a)(A x 1): A is made
 * of bases of the two eigenspaces of the pulled-back Z (polar decomposition of K_a = <a|U). Then V_1 = V_0 W.
 * When W is a product of one operator on the carriers that are there and of one-wire operators on inputs
 * still to come, the former joins A, the latter wait as gates conditioned on the bit, and only V_0 is factored
 * on: k measurements then cost k conditions, not 2^k variants. This is what the semiclassical Fourier
 * transform does (Griffiths, Niu, PRL 76, 3228 (1996)). Otherwise V_0 and V_1 are factored separately under
 * the conditions bit = 0 and bit = 1, up to `VARIANTS_MAX` variants at a time.
 * Convention: as in `chain.ts`; `when` lists the bits (by output) that must have the given values.
 * Fails: returns null when more variants would be needed.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { adjoint, identity, kron, mul } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { hermitianEigen } from '../numeric/hermitian-eigen.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import {
  type ChainPlan,
  DEPENDENCE_MIN,
  outputFrame,
  stagesOf,
  supportOf,
  turnToIdentity,
} from './chain.ts';
import {
  averageOver,
  conditionedOn,
  type Residual,
  reducedPauli,
  reorderBits,
  splitOff,
  wholeResidual,
  withoutOutput,
} from './residual.ts';

/** At most this many versions of a block, one for each combination of bits it depends on. */
export const VARIANTS_MAX = 16;
/** W counts as a product when it is one to this D. */
const PRODUCT_TOLERANCE = 1e-13;

export type BitValue = { output: number; value: 0 | 1 };
export type FeedStep =
  | { kind: 'enter'; input: number }
  | { kind: 'block'; wires: readonly number[]; matrix: Float64Array; when: readonly BitValue[] }
  | { kind: 'leave'; output: number; carrier: number };

type Variant = { residual: Residual; when: readonly BitValue[] };
type Waiting = { wire: number; matrix: Float64Array; when: readonly BitValue[] };

/** `measured[output]`: it is measured as it leaves. The plan's needs must be those of that contract. */
export function factorFeedForward(
  u: Float64Array,
  n: number,
  plan: ChainPlan,
  measured: readonly boolean[],
  dependenceMin = DEPENDENCE_MIN,
): FeedStep[] | null {
  let variants: Variant[] = [{ residual: wholeResidual(u, n), when: [] }];
  let present: number[] = [];
  let waiting: Waiting[] = [];
  const steps: FeedStep[] = [];
  for (const { enters, leaves } of stagesOf(plan, n)) {
    present = [...present, ...enters].sort((a, b) => a - b);
    for (const input of enters) {
      steps.push({ kind: 'enter', input });
      for (const { wire, matrix, when } of waiting) {
        if (wire === input) steps.push({ kind: 'block', wires: [wire], matrix, when });
      }
      waiting = waiting.filter(({ wire }) => wire !== input);
    }
    for (const output of leaves) {
      const next: Variant[] = [];
      let carrier: number | undefined;
      for (const variant of variants) {
        const split = splitMeasured(
          variant,
          output,
          present,
          measured[output]!,
          dependenceMin,
          carrier,
        );
        carrier = split.carrier;
        const { wires, matrix } = split;
        steps.push({ kind: 'block', wires, matrix, when: variant.when });
        waiting.push(...split.waiting);
        next.push(...split.variants);
      }
      if (next.length > VARIANTS_MAX || carrier === undefined) return null;
      variants = next;
      steps.push({ kind: 'leave', output, carrier });
      present = present.filter((c) => c !== carrier);
    }
  }
  return steps;
}

type Split = {
  wires: readonly number[];
  matrix: Float64Array;
  carrier: number;
  variants: Variant[];
  waiting: Waiting[];
};

function splitMeasured(
  { residual, when }: Variant,
  output: number,
  present: readonly number[],
  isMeasured: boolean,
  dependenceMin: number,
  carrierGiven: number | undefined,
): Split {
  const paulis = isMeasured ? (['Z'] as const) : (['Z', 'X'] as const);
  let wires = supportOf(residual, output, present, dependenceMin, paulis);
  if (carrierGiven !== undefined && !wires.includes(carrierGiven)) {
    wires = [...wires, carrierGiven].sort((a, b) => a - b);
  }
  const k = wires.length;
  const z = reducedPauli(residual, output, 'Z', wires);
  const frame = outputFrame(z, reducedPauli(residual, output, 'X', wires), k);
  const given = carrierGiven === undefined ? undefined : wires.indexOf(carrierGiven);
  const { matrix, place } = turnToIdentity(frame, wires, output, given);
  const carrier = wires[place]!;
  const after = splitOff(residual, matrix, wires);
  if (!isMeasured) {
    const variants = [{ residual: withoutOutput(after, output, carrier), when }];
    return { wires, matrix, carrier, variants, waiting: [] };
  }
  const branches = ([0, 1] as const).map((bit) => branchOf(after, output, carrier, bit));
  const [zero, one] = branches as [Residual, Residual];
  const d = zero.rows.length === 0 ? 1 : Math.sqrt(zero.rows.length / 2);
  // rows hold V^dag, so W = V_0^dag V_1 is the first times the adjoint of the second
  const w = mul(zero.rows, adjoint(one.rows, d), d);
  const rest = present.filter((c) => c !== carrier);
  const product = productOf(w, zero.carriers, rest);
  if (!product) {
    const variants = branches.map((branch, value) => ({
      residual: branch,
      when: [...when, { output, value: value as 0 | 1 }],
    }));
    return { wires, matrix, carrier, variants, waiting: [] };
  }
  const whenOne = [...when, { output, value: 1 as const }];
  const waiting = product.waiting.map((part) => ({ ...part, when: whenOne }));
  const joined = joinControlled(wires, matrix, carrier, rest, product.here);
  return { ...joined, carrier, variants: [{ residual: zero, when }], waiting };
}

function branchOf(after: Residual, output: number, carrier: number, bit: 0 | 1): Residual {
  const part = conditionedOn(after, output, carrier, bit);
  return { ...part, rows: nearestUnitary(part.rows, 2 ** part.carriers.length) };
}

/** W as (operator on `here`) x (one-wire operators on the other carriers), or null when it is none. */
function productOf(
  w: Float64Array,
  carriers: readonly number[],
  here: readonly number[],
): { here: Float64Array; waiting: { wire: number; matrix: Float64Array }[] } | null {
  const m = carriers.length;
  const later = carriers.filter((c) => !here.includes(c));
  const order = [...here, ...later].map((c) => carriers.indexOf(c));
  const sorted = reorderBits(w, order);
  const factors = later.map((_, j) => leadingFactor(sorted, m, here.length + j));
  // what is left on the carriers that are there once the factors are divided out
  const undone = sorted.slice();
  factors.forEach((factor, j) => {
    applyMatrixInto(undone, adjoint(factor, 2), [here.length + j], m, 2 ** m);
  });
  const places = later.map((_, j) => here.length + j);
  const mean = nearestUnitary(averageOver(undone, m, places), 2 ** here.length);
  const isProduct = [mean, ...factors].every((factor) => factor.every(Number.isFinite));
  if (!isProduct) return null;
  let rebuilt = mean;
  let size = 2 ** here.length;
  for (const factor of factors) {
    rebuilt = kron(rebuilt, factor, size, 2);
    size *= 2;
  }
  if (hilbertSchmidtDistance(sorted, rebuilt).distance > PRODUCT_TOLERANCE) return null;
  const waiting = later.map((wire, j) => ({ wire, matrix: factors[j]! }));
  const idle = identity(2);
  return {
    here: mean,
    waiting: waiting.filter(
      ({ matrix }) => hilbertSchmidtDistance(idle, matrix).distance > PRODUCT_TOLERANCE,
    ),
  };
}

/** The one-wire operator of largest weight in the operator-Schmidt decomposition of w at one place. */
function leadingFactor(w: Float64Array, m: number, place: number): Float64Array {
  const d = 2 ** m;
  const bit = 2 ** (m - 1 - place);
  // Gram matrix of the four parts w_(ab), a and b the row's and the column's bit
  const gram = new Float64Array(32);
  for (let p = 0; p < 4; p++) {
    for (let q = p; q < 4; q++) {
      let [re, im] = [0, 0];
      for (let i = 0; i < d; i++) {
        if (i & bit) continue;
        for (let j = 0; j < d; j++) {
          if (j & bit) continue;
          const s = (i + (p >> 1) * bit) * d + j + (p & 1) * bit;
          const t = (i + (q >> 1) * bit) * d + j + (q & 1) * bit;
          re += w[s]! * w[t]! + w[d * d + s]! * w[d * d + t]!;
          im += w[d * d + s]! * w[t]! - w[s]! * w[d * d + t]!;
        }
      }
      gram[p * 4 + q] = re;
      gram[q * 4 + p] = re;
      gram[16 + p * 4 + q] = p === q ? 0 : im;
      gram[16 + q * 4 + p] = p === q ? 0 : -im;
    }
  }
  const { vectors } = hermitianEigen(gram, 4);
  const factor = new Float64Array(8);
  for (let p = 0; p < 4; p++) {
    factor[p] = vectors[p * 4 + 3]! * Math.SQRT2;
    factor[4 + p] = vectors[16 + p * 4 + 3]! * Math.SQRT2;
  }
  return nearestUnitary(factor, 2);
}

/** |0><0| x 1 + |1><1| x `here`, the control being the carrier, after the block; idle carriers are left out. */
function joinControlled(
  wires: readonly number[],
  matrix: Float64Array,
  carrier: number,
  rest: readonly number[],
  here: Float64Array,
): { wires: readonly number[]; matrix: Float64Array } {
  const k = rest.length;
  if (hilbertSchmidtDistance(identity(2 ** k), here).distance <= PRODUCT_TOLERANCE) {
    return { wires, matrix };
  }
  const all = [...new Set([...wires, ...rest])].sort((a, b) => a - b);
  const size = 2 ** all.length;
  const out = identity(size);
  applyMatrixInto(
    out,
    matrix,
    wires.map((w) => all.indexOf(w)),
    all.length,
    size,
  );
  const control = 2 ** (all.length - 1 - all.indexOf(carrier));
  const places = rest.map((w) => all.indexOf(w));
  applyMatrixInto(out, here, places, all.length, size, control, control);
  return { wires: all, matrix: out };
}
