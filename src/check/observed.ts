/**
 * Reduces an unfolded circuit to what an observer sees: for every outcome of the observed bits, the Kraus operators
 * from the inputs to the kept outputs.
 *
 * Shape: `outcomes` maps a bit string (observed bits in the order of `names`) to a matrix with one column per
 * unobserved state e (axes traced out) and rows (k, c): kept outputs k (output order, first = most significant)
 * times input basis states c (input order, first = most significant). So the matrix of outcome m is A_m with
 * A_m A_m^dag = the Choi operator of that outcome.
 * Normalisation: sum over outcomes of ||A_m||^2 = 2^(number of `any` inputs).
 */
import { type BitExpression, evaluateBits } from '../circuit/circuit.ts';
import { InputError } from '../input-error.ts';
import type { Unfolded } from './unfold.ts';

export type Observed = {
  /** Rows of every matrix: 2^(kept + any inputs). */
  rows: number;
  outcomes: Map<string, { matrix: Float64Array; columns: number }>;
};

/** What is looked at: the axes of kept outputs, and boolean expressions over axes. */
export type Observables = {
  keptAxes: readonly number[];
  bits: readonly BitExpression[];
  /** The inputs that are `any`, ascending. */
  anyInputs: readonly number[];
};

export function observe(unfolded: Unfolded, observables: Observables, name: string): Observed {
  const { axes, data, columnInputs } = unfolded;
  const { keptAxes, bits, anyInputs } = observables;
  if (new Set(keptAxes).size !== keptAxes.length || keptAxes.some((axis) => axis < 0)) {
    throw new InputError({
      code: 'missing-output',
      message: 'expected every kept output to leave once, got outputs without a place',
      file: name,
      hint: 'each needs an annotation @wiregauge.leaves, or a wire of its own number',
    });
  }
  const keptMask = maskOf(keptAxes, axes);
  const columnsIn = 2 ** columnInputs.length;
  const columnOrder = permutedStates(anyInputs, columnInputs);
  const keptOffsets = offsetsOf(keptAxes, axes);
  const rowsOut = keptOffsets.length * columnsIn;
  const groups = groupByOutcome(axes, keptMask, bits);
  const outcomes: Observed['outcomes'] = new Map();
  const total = 2 ** axes * columnsIn;
  for (const [key, states] of groups) {
    const columns = states.length;
    const matrix = new Float64Array(2 * rowsOut * columns);
    for (let k = 0; k < keptOffsets.length; k++) {
      for (let c = 0; c < columnsIn; c++) {
        const to = (k * columnsIn + c) * columns;
        for (let e = 0; e < columns; e++) {
          const from = (states[e]! + keptOffsets[k]!) * columnsIn + columnOrder[c]!;
          matrix[to + e] = data[from]!;
          matrix[rowsOut * columns + to + e] = data[total + from]!;
        }
      }
    }
    outcomes.set(key, withoutZeroColumns(matrix, rowsOut, columns));
  }
  return { rows: rowsOut, outcomes };
}

function maskOf(places: readonly number[], axes: number): number {
  return places.reduce((mask, axis) => mask + 2 ** (axes - 1 - axis), 0);
}

/** Row offset of each state of the given axes, the first being the most significant. */
function offsetsOf(places: readonly number[], axes: number): Int32Array {
  const out = new Int32Array(2 ** places.length);
  for (let state = 0; state < out.length; state++) {
    places.forEach((axis, k) => {
      if (state & (1 << (places.length - 1 - k))) out[state]! += 2 ** (axes - 1 - axis);
    });
  }
  return out;
}

/** Column index in order of entry for each column index in the order wanted. */
function permutedStates(wanted: readonly number[], entered: readonly number[]): Int32Array {
  const n = wanted.length;
  const out = new Int32Array(2 ** n);
  for (let state = 0; state < out.length; state++) {
    wanted.forEach((input, k) => {
      const place = entered.indexOf(input);
      if (state & (1 << (n - 1 - k))) out[state]! += 2 ** (n - 1 - place);
    });
  }
  return out;
}

function groupByOutcome(
  axes: number,
  keptMask: number,
  bits: readonly BitExpression[],
): Map<string, number[]> {
  const groups = new Map<string, number[]>();
  const rows = 2 ** axes;
  for (let row = 0; row < rows; row++) {
    if (row & keptMask) continue;
    const isOne = (axis: number): boolean => ((row >>> (axes - 1 - axis)) & 1) === 1;
    let key = '';
    for (const bit of bits) {
      const value = bit.kind === 'bit' ? isOne(bit.bit) : evaluateBits(bit, isOne);
      key += value ? '1' : '0';
    }
    const states = groups.get(key);
    if (states) states.push(row);
    else groups.set(key, [row]);
  }
  return groups;
}

/** Leaves out unobserved states of exactly zero amplitude, so that unused axes cost nothing. */
function withoutZeroColumns(
  matrix: Float64Array,
  rows: number,
  columns: number,
): { matrix: Float64Array; columns: number } {
  const used: number[] = [];
  for (let e = 0; e < columns; e++) {
    for (let r = 0; r < 2 * rows; r++) {
      if (matrix[r * columns + e] !== 0) {
        used.push(e);
        break;
      }
    }
  }
  if (used.length === columns) return { matrix, columns };
  const out = new Float64Array(2 * rows * used.length);
  for (let r = 0; r < 2 * rows; r++) {
    used.forEach((e, to) => {
      out[r * used.length + to] = matrix[r * columns + e]!;
    });
  }
  return { matrix: out, columns: used.length };
}
