/**
 * Finds which placements of entanglers are as good as each other, because the target looks the same from another side.
 *
 * Shape: u is 2^n x 2^n, planar. A symmetry is an order of the wires, and whether time runs backwards: a placement does if and
 * only if the placement with its wires renumbered (wire k becomes order[k]), read backwards if so, does.
 * Method: with v = u in the other order, or its transpose for time backwards, the two are alike when single-wire gates before
 * and after make them equal; every two-wire gate is alike to itself with its wires exchanged, and to its transpose. The
 * single-wire gates are found one by one: the best one with the others fixed is the polar factor of its environment.
 * Result: only symmetries that were reached to `OVERLAP_GAP`; the identity is not listed.
 * Cost: about 2 n! * starts * sweeps * 2 n products of size 2^n. Meant for n = 3.
 */
import { withWireOrder } from '../circuit/unitary.ts';
import { adjoint, identity, kron, mul } from '../numeric/complex-matrix.ts';
import { random } from '../numeric/random.ts';
import { haarUnitary, polarFactor } from '../numeric/svd.ts';
import type { Pair } from './placement-beam.ts';

export type Symmetry = { order: readonly number[]; isReversed: boolean };

const OVERLAP_GAP = 1e-9;
const STARTS = 6;
const SWEEPS_MAX = 60;
/** After this many sweeps a start must have come this near to equality. */
const EARLY = { sweeps: 12, gap: 0.05 };

export function symmetriesOf(u: Float64Array, wires: number, links: readonly Pair[]): Symmetry[] {
  const found: Symmetry[] = [];
  for (const order of ordersOf(wires)) {
    if (!keepsLinks(order, links)) continue;
    const moved = renumbered(u, order);
    for (const isReversed of [false, true]) {
      const isIdentity = !isReversed && order.every((to, from) => to === from);
      if (isIdentity) continue;
      const v = isReversed ? transposed(moved, 2 ** wires) : moved;
      if (areAlike(u, v, wires)) found.push({ order, isReversed });
    }
  }
  return found;
}

/** The placement seen from the other side, pairs in the orientation of the links. */
export function mirrored(pairs: readonly Pair[], { order, isReversed }: Symmetry): Pair[] {
  const moved = pairs.map(([a, b]): Pair => {
    const [p, q] = [order[a]!, order[b]!];
    return p < q ? [p, q] : [q, p];
  });
  return isReversed ? moved.reverse() : moved;
}

function ordersOf(wires: number): number[][] {
  let list: number[][] = [[]];
  for (let k = 0; k < wires; k++) {
    list = list.flatMap((order) =>
      Array.from({ length: wires }, (_, wire) => wire)
        .filter((wire) => !order.includes(wire))
        .map((wire) => [...order, wire]),
    );
  }
  return list;
}

function keepsLinks(order: readonly number[], links: readonly Pair[]): boolean {
  const has = (a: number, b: number): boolean =>
    links.some(([p, q]) => (p === a && q === b) || (p === b && q === a));
  return links.every(([a, b]) => a < b && has(order[a]!, order[b]!));
}

/** u with wire k called order[k]. */
function renumbered(u: Float64Array, order: readonly number[]): Float64Array {
  return withWireOrder(u, order.map((_, wire) => order.indexOf(wire))); // biome-ignore format: one call
}

function transposed(u: Float64Array, d: number): Float64Array {
  return adjoint(u, d).map((x, k) => (k < d * d ? x : -x));
}

/** Whether u = (a_1 x a_2 ..) v (b_1 x b_2 ..) up to a phase for some single-wire gates. */
export function areAlike(u: Float64Array, v: Float64Array, wires: number): boolean {
  const d = 2 ** wires;
  const back = adjoint(u, d);
  for (let start = 0; start < STARTS; start++) {
    const draw = random(1, 'alike', start);
    const one = (): Float64Array => (start === 0 ? identity(2) : haarUnitary(2, draw));
    const a = Array.from({ length: wires }, one);
    const b = Array.from({ length: wires }, one);
    for (let sweep = 0; sweep < SWEEPS_MAX; sweep++) {
      // Tr(u^dag A v B) = Tr(A (v B u^dag)) = Tr(B (u^dag A v))
      improve(a, mul(mul(v, productOf(b), d), back, d), wires);
      const gap = 1 - improve(b, mul(mul(back, productOf(a), d), v, d), wires) / d;
      if (gap < OVERLAP_GAP) return true;
      if (sweep === EARLY.sweeps && gap > EARLY.gap) break;
    }
  }
  return false;
}

function productOf(list: readonly Float64Array[]): Float64Array {
  let out: Float64Array = Float64Array.from([1, 0]);
  let size = 1;
  for (const factor of list) {
    out = kron(out, factor, size, 2);
    size *= 2;
  }
  return out;
}

/** Each factor in turn becomes the best one for |Tr((x_1 x x_2 ..) t)|; returns that value. */
function improve(list: Float64Array[], t: Float64Array, wires: number): number {
  const d = 2 ** wires;
  let value = 0;
  for (let wire = 0; wire < wires; wire++) {
    const others = list.map((factor, k) => (k === wire ? identity(2) : factor));
    const whole = mul(t, productOf(others), d);
    const environment = new Float64Array(8);
    const bit = 2 ** (wires - 1 - wire);
    for (let row = 0; row < d; row++) {
      for (const set of [0, bit]) {
        const column = (row & ~bit) | set;
        const at = (row & bit ? 2 : 0) + (set ? 1 : 0);
        environment[at]! += whole[row * d + column]!;
        environment[4 + at]! += whole[d * d + row * d + column]!;
      }
    }
    // Tr(x w) is largest for x = the adjoint of the polar factor of w, where it is the sum of singular values
    const polar = polarFactor(environment, 2);
    list[wire] = adjoint(polar, 2);
    value = 0;
    for (let k = 0; k < 8; k++) value += polar[k]! * environment[k]!;
  }
  return value;
}
