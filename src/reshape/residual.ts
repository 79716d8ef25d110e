/**
 * What is left of a unitary while blocks are split off it: the operator from its carriers to its outputs,
 * and the small operators read off from it.
 *
 * Shape: `rows` is the ADJOINT of the residual M, 2^m x 2^m planar: row index = state of the carriers (in
 * the order of `carriers`, first = most significant), column index = state of the outputs (in the order of
 * `outputs`). So a block A on some carriers is split off by M -> M A^dag, which is `rows -> A rows`.
 * Convention: a carrier is named by the input that enters on it.
 * Method: the Pauli of an output, pulled back to the carriers, is M^dag P M; averaged over all carriers but
 * a few it becomes an operator on those few (theory: Schumacher, Westmoreland, Quantum Inf. Process. 4, 13
 * (2005); the average is the nearest operator that is trivial elsewhere).
 * Cost: a reduced Pauli on k of m carriers takes 8 * 2^(2m + k) flops.
 */
import { assert } from '../assert.ts';
import { applyMatrixInto } from '../circuit/unitary.ts';
import { adjoint, identity } from '../numeric/complex-matrix.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';

export type Residual = {
  rows: Float64Array;
  carriers: readonly number[];
  outputs: readonly number[];
};

/** The residual before anything is split off: input k sits on carrier k. */
export function wholeResidual(u: Float64Array, n: number): Residual {
  const all = Array.from({ length: n }, (_, k) => k);
  return { rows: adjoint(u, 2 ** n), carriers: all, outputs: all };
}

/** Row offsets of the 2^k states of some bits of an m-bit index; `places` count from the most significant. */
export function bitOffsets(places: readonly number[], m: number): Int32Array {
  const k = places.length;
  const offsets = new Int32Array(2 ** k);
  for (let state = 0; state < offsets.length; state++) {
    for (let b = 0; b < k; b++) {
      if (state & (1 << (k - 1 - b))) offsets[state]! += 2 ** (m - 1 - places[b]!);
    }
  }
  return offsets;
}

/** The places of 0..m-1 that are not in `places`, ascending. */
export function otherPlaces(places: readonly number[], m: number): number[] {
  return Array.from({ length: m }, (_, k) => k).filter((k) => !places.includes(k));
}

/**
 * M^dag P M averaged over every carrier that is not in `on`: Hermitian 2^k x 2^k on those carriers in the
 * order given, P = X or Z on `output`.
 */
export function reducedPauli(
  residual: Residual,
  output: number,
  pauli: 'X' | 'Z',
  on: readonly number[],
): Float64Array {
  const { rows, carriers, outputs } = residual;
  const m = carriers.length;
  const d = 2 ** m;
  const im = d * d;
  const places = on.map((carrier) => carriers.indexOf(carrier));
  const inside = bitOffsets(places, m);
  const outside = bitOffsets(otherPlaces(places, m), m);
  const size = inside.length;
  const bit = 2 ** (m - 1 - outputs.indexOf(output));
  const flip = pauli === 'X' ? bit : 0;
  const out = new Float64Array(2 * size * size);
  for (let a = 0; a < size; a++) {
    for (let b = a; b < size; b++) {
      let [re, imag] = [0, 0];
      for (const rest of outside) {
        const p = (inside[a]! + rest) * d;
        const q = (inside[b]! + rest) * d;
        for (let c = 0; c < d; c++) {
          const sign = pauli === 'Z' && (c & bit) !== 0 ? -1 : 1;
          const [xr, xi] = [rows[p + c]!, rows[im + p + c]!];
          const [yr, yi] = [rows[q + (c ^ flip)]!, rows[im + q + (c ^ flip)]!];
          re += sign * (xr * yr + xi * yi);
          imag += sign * (xi * yr - xr * yi);
        }
      }
      const scale = 1 / outside.length;
      out[a * size + b] = re * scale;
      out[b * size + a] = re * scale;
      out[size * size + a * size + b] = imag * scale;
      out[size * size + b * size + a] = a === b ? 0 : -imag * scale;
    }
  }
  return out;
}

/** The trace of a k-bit operator over the bits at `places`, divided by their number of states. */
export function averageOver(
  operator: Float64Array,
  k: number,
  places: readonly number[],
): Float64Array {
  const d = 2 ** k;
  const summed = bitOffsets(places, k);
  const kept = bitOffsets(otherPlaces(places, k), k);
  const size = kept.length;
  const out = new Float64Array(2 * size * size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b < size; b++) {
      let [re, im] = [0, 0];
      for (const s of summed) {
        const at = (kept[a]! + s) * d + kept[b]! + s;
        re += operator[at]!;
        im += operator[d * d + at]!;
      }
      out[a * size + b] = re / summed.length;
      out[size * size + a * size + b] = im / summed.length;
    }
  }
  return out;
}

/** How much a k-bit operator depends on one bit: || O - (Tr_bit O) x 1/2 ||_F^2 / 2^k. */
export function dependence(operator: Float64Array, k: number, place: number): number {
  const d = 2 ** k;
  const bit = 2 ** (k - 1 - place);
  let sum = 0;
  for (let half = 0; half < 2; half++) {
    const base = half * d * d;
    for (let a = 0; a < d; a++) {
      for (let b = 0; b < d; b++) {
        const x = operator[base + a * d + b]!;
        if ((a & bit) !== (b & bit)) sum += x * x;
        else sum += ((x - operator[base + (a ^ bit) * d + (b ^ bit)]!) / 2) ** 2;
      }
    }
  }
  return sum / d;
}

/** Splits a block off: M -> M A^dag. `matrix` acts on the carriers `wires`, first = most significant. */
export function splitOff(
  residual: Residual,
  matrix: Float64Array,
  wires: readonly number[],
): Residual {
  const { rows, carriers, outputs } = residual;
  const m = carriers.length;
  const places = wires.map((carrier) => carriers.indexOf(carrier));
  assert(!places.includes(-1), () => `block on carriers ${wires} that are not there`);
  const copy = rows.slice();
  applyMatrixInto(copy, matrix, places, m, 2 ** m);
  return { rows: copy, carriers, outputs };
}

/** The residual with carrier and output removed: the part of it from state `bit` to state `bit`. */
export function conditionedOn(
  residual: Residual,
  output: number,
  carrier: number,
  bit: 0 | 1,
): Residual {
  const { rows, carriers, outputs } = residual;
  const m = carriers.length;
  const d = 2 ** m;
  const carrierPlace = carriers.indexOf(carrier);
  const outputPlace = outputs.indexOf(output);
  const rowOf = bitOffsets(otherPlaces([carrierPlace], m), m);
  const columnOf = bitOffsets(otherPlaces([outputPlace], m), m);
  const rowBit = bit * 2 ** (m - 1 - carrierPlace);
  const columnBit = bit * 2 ** (m - 1 - outputPlace);
  const size = d / 2;
  const out = new Float64Array(2 * size * size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b < size; b++) {
      const at = (rowOf[a]! + rowBit) * d + columnOf[b]! + columnBit;
      out[a * size + b] = rows[at]!;
      out[size * size + a * size + b] = rows[d * d + at]!;
    }
  }
  return {
    rows: out,
    carriers: carriers.filter((c) => c !== carrier),
    outputs: outputs.filter((o) => o !== output),
  };
}

/** The residual once `output` has left on `carrier`: the average of both parts, made unitary again. */
export function withoutOutput(residual: Residual, output: number, carrier: number): Residual {
  const zero = conditionedOn(residual, output, carrier, 0);
  const one = conditionedOn(residual, output, carrier, 1);
  const mean = zero.rows.map((x, k) => (x + one.rows[k]!) / 2);
  return { ...zero, rows: nearestUnitary(mean, 2 ** zero.carriers.length) };
}

/** The same operator with its bits in another order: new place k holds old place `from[k]`. */
export function reorderBits(operator: Float64Array, from: readonly number[]): Float64Array {
  const k = from.length;
  const d = 2 ** k;
  const index = bitOffsets(from, k);
  const out = new Float64Array(operator.length);
  for (let a = 0; a < d; a++) {
    for (let b = 0; b < d; b++) {
      out[a * d + b] = operator[index[a]! * d + index[b]!]!;
      out[d * d + a * d + b] = operator[d * d + index[a]! * d + index[b]!]!;
    }
  }
  return out;
}

/** A matrix on `wires`, as one on `all` (which contains them): identity on the others. */
export function widen(
  matrix: Float64Array,
  wires: readonly number[],
  all: readonly number[],
): Float64Array {
  const out = identity(2 ** all.length);
  const places = wires.map((wire) => all.indexOf(wire));
  return applyMatrixInto(out, matrix, places, all.length, 2 ** all.length);
}
