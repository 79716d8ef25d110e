/** Circuits of 4 to 10 wires written gate by gate, as people write them: each with its name. */
import { type Circuit, emptyCircuit, type GateOperation, gate } from '../../src/circuit/circuit.ts';

const of = (name: string, wires: number, operations: GateOperation[]): Circuit => ({
  ...emptyCircuit(wires, 0, name),
  operations,
});

/** A Toffoli in CX and T: Nielsen, Chuang, figure 4.9. */
export function toffoli(a: number, b: number, c: number): GateOperation[] {
  return [
    gate('h', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [b]),
    gate('t', [c]),
    gate('h', [c]),
    gate('cx', [a, b]),
    gate('t', [a]),
    gate('tdg', [b]),
    gate('cx', [a, b]),
  ];
}

/**
 * Ripple-carry sum of two n-bit numbers: carries go up through `a`, sums end in `b` (Cuccaro et al.,
 * quant-ph/0410184).
 */
export function adder(n: number): Circuit {
  // wires: carry in 0, then b_k at 1 + 2k, a_k at 2 + 2k, carry out last
  const a = (k: number): number => (k < 0 ? 0 : 2 + 2 * k);
  const b = (k: number): number => 1 + 2 * k;
  const operations: GateOperation[] = [];
  for (let k = 0; k < n; k++) {
    operations.push(gate('cx', [a(k), b(k)]), gate('cx', [a(k), a(k - 1)]));
    operations.push(...toffoli(a(k - 1), b(k), a(k)));
  }
  operations.push(gate('cx', [a(n - 1), 2 * n + 1]));
  for (let k = n - 1; k >= 0; k--) {
    operations.push(...toffoli(a(k - 1), b(k), a(k)));
    operations.push(gate('cx', [a(k), a(k - 1)]), gate('cx', [a(k - 1), b(k)]));
  }
  return of(`adder ${n}`, 2 * n + 2, operations);
}

/** exp(-i t/2 P) for a product of Paulis, by a ladder of CX. */
export function pauliRotation(
  paulis: readonly (readonly [number, string])[],
  t: number,
): GateOperation[] {
  const before: GateOperation[] = [];
  const after: GateOperation[] = [];
  for (const [wire, pauli] of paulis) {
    if (pauli === 'x') {
      before.push(gate('h', [wire]));
      after.push(gate('h', [wire]));
    } else if (pauli === 'y') {
      before.push(gate('rx', [wire], Math.PI / 2));
      after.push(gate('rx', [wire], -Math.PI / 2));
    }
  }
  const wires = paulis.map(([wire]) => wire);
  const ladder = wires.slice(1).map((wire, k) => gate('cx', [wires[k]!, wire]));
  const middle = gate('rz', [wires.at(-1)!], t);
  return [...before, ...ladder, middle, ...[...ladder].reverse(), ...after];
}

/** One Trotter step of a chain with XX, YY and ZZ terms, pair by pair. */
export function trotterChain(n: number): Circuit {
  const operations: GateOperation[] = [];
  for (let k = 0; k + 1 < n; k++) {
    for (const pauli of ['x', 'y', 'z']) {
      operations.push(
        ...pauliRotation(
          [
            [k, pauli],
            [k + 1, pauli],
          ],
          0.2 + 0.1 * k,
        ),
      );
    }
  }
  return of(`Trotter chain ${n}`, n, operations);
}

/** One layer of ZZ terms on a ring by CX, Rz, CX, all even pairs in the middle, then mixing. */
export function ringLayer(n: number): Circuit {
  const operations: GateOperation[] = [];
  const pairs = Array.from({ length: n }, (_, k) => [k, (k + 1) % n] as const);
  for (const [a, b] of [...pairs.slice(n / 2), ...pairs.slice(0, n / 2)]) {
    operations.push(gate('cx', [a, b]), gate('rz', [b], 0.3 + a), gate('cx', [a, b]));
  }
  for (let k = 0; k < n; k++) operations.push(gate('rx', [k], 0.7));
  return of(`ring layer ${n}`, n, operations);
}

/** Terms of three Zs on neighbouring wires, each by a ladder, in a bad order. */
export function tripleLayer(n: number): Circuit {
  const operations: GateOperation[] = [];
  const starts = Array.from({ length: n - 2 }, (_, k) => k);
  const order = [...starts.filter((k) => k % 2), ...starts.filter((k) => k % 2 === 0).reverse()];
  for (const k of order) {
    operations.push(
      ...pauliRotation(
        [
          [k, 'z'],
          [k + 2, 'z'],
          [k + 1, 'z'],
        ],
        0.4 + k,
      ),
    );
  }
  for (let k = 0; k < n; k++) operations.push(gate('rx', [k], 0.3));
  return of(`triple layer ${n}`, n, operations);
}

/** Parity checks of a repetition code: n data wires, n - 1 checks, each check a wire of its own. */
export function checks(n: number): Circuit {
  const operations: GateOperation[] = [];
  for (let k = 0; k + 1 < n; k++) operations.push(gate('cx', [k, n + k]));
  for (let k = 0; k + 1 < n; k++) operations.push(gate('cx', [k + 1, n + k]));
  return of(`checks ${n}`, 2 * n - 1, operations);
}

/** Four-wire checks: X and Z type by one check wire each, checks written gate by gate with H and CX. */
export function plaquette(): Circuit {
  const operations: GateOperation[] = [gate('h', [4])];
  for (let k = 0; k < 4; k++) operations.push(gate('cx', [4, k]));
  operations.push(gate('h', [4]));
  for (let k = 0; k < 4; k++) operations.push(gate('cx', [k, 5]));
  return of('plaquette', 6, operations);
}

/**
 * Phase estimation with t bits on one eigenstate wire, controlled phases as CX and Rz, inverse transform at
 * the end.
 */
export function phaseEstimation(t: number): Circuit {
  const operations: GateOperation[] = [];
  const cp = (a: number, b: number, angle: number): void => {
    operations.push(gate('rz', [a], angle / 2), gate('rz', [b], angle / 2), gate('cx', [a, b]));
    operations.push(gate('rz', [b], -angle / 2), gate('cx', [a, b]));
  };
  for (let k = 0; k < t; k++) operations.push(gate('h', [k]));
  for (let k = 0; k < t; k++) cp(k, t, 0.9 * 2 ** k);
  for (let k = t - 1; k >= 0; k--) {
    for (let j = t - 1; j > k; j--) cp(j, k, -Math.PI / 2 ** (j - k));
    operations.push(gate('h', [k]));
  }
  return of(`phase estimation ${t}`, t + 1, operations);
}

/** CX through intermediate wires, up and down a ladder. */
export function longRange(n: number): Circuit {
  const operations: GateOperation[] = [];
  const hop = (from: number, to: number): void => {
    for (let k = from; k < to; k++) operations.push(gate('cx', [k, k + 1]));
    for (let k = to - 2; k >= from; k--) operations.push(gate('cx', [k, k + 1]));
    for (let k = from + 1; k < to; k++) operations.push(gate('cx', [k, k + 1]));
    for (let k = to - 2; k > from; k--) operations.push(gate('cx', [k, k + 1]));
  };
  hop(0, 2);
  for (let k = 0; k < n; k++) operations.push(gate('ry', [k], 0.3 + k));
  hop(n - 3, n - 1);
  hop(1, 3);
  return of(`long range ${n}`, n, operations);
}

/** A controlled increment, carry by carry with Toffolis on borrowed wires and undone. */
export function increment(): Circuit {
  const operations = [
    ...toffoli(0, 1, 4),
    ...toffoli(4, 2, 3),
    ...toffoli(0, 1, 4),
    ...toffoli(0, 1, 2),
    gate('cx', [0, 1]),
    gate('x', [0]),
  ];
  return of('increment', 5, operations);
}

/** Swaps written as three CX along a line. */
export function carried(n: number): Circuit {
  const operations: GateOperation[] = [gate('ry', [0], 0.4)];
  for (let k = 0; k + 1 < n; k++) {
    operations.push(gate('cx', [k, k + 1]), gate('cx', [k + 1, k]), gate('cx', [k, k + 1]));
    operations.push(gate('rxx', [k, k + 1], 0.2 + k));
  }
  return of(`carried ${n}`, n, operations);
}

export const WRITTEN: readonly Circuit[] = [
  adder(1),
  adder(2),
  adder(4),
  trotterChain(5),
  trotterChain(8),
  ringLayer(6),
  ringLayer(10),
  tripleLayer(6),
  tripleLayer(9),
  checks(3),
  checks(5),
  plaquette(),
  phaseEstimation(3),
  phaseEstimation(6),
  longRange(5),
  longRange(7),
  increment(),
  carried(5),
  carried(8),
];
