import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { bitPairs } from '../../src/check/observation.ts';
import { comparePieces } from '../../src/check/piece-by-piece.ts';
import { sidesOf } from '../../src/check/sides.ts';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { type Random, random } from '../../src/numeric/random.ts';

const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));
const block = (wires: number, operations: readonly GateOperation[]): Circuit => ({
  ...emptyCircuit(wires),
  operations: [...operations],
});

function gates(n: number, count: number, draw: Random): GateOperation[] {
  return Array.from({ length: count }, () => {
    const a = whole(draw, n);
    const b = (a + 1 + whole(draw, 3)) % n;
    const kind = whole(draw, 4);
    if (kind === 0) return gate('u3', [a], 3 * draw(), 3 * draw(), 3 * draw());
    if (kind === 1) return gate('crx', [a, b], 1 + draw());
    return kind === 2 ? gate('cx', [a, b]) : gate('rxx', [a, b], 1 + draw());
  });
}

/** Runs of neighbouring gates on at most three wires become one matrix, or are split in two by a unitary and its inverse. */
function rewritten(list: readonly GateOperation[], draw: Random): GateOperation[] {
  const out: GateOperation[] = [];
  for (let k = 0; k < list.length; ) {
    let end = k + 1;
    const wires = new Set(list[k]!.wires);
    while (
      end < list.length &&
      new Set([...wires, ...list[end]!.wires]).size <= 3 &&
      draw() < 0.8
    ) {
      for (const wire of list[end]!.wires) wires.add(wire);
      end++;
    }
    const order = [...wires].sort((a, b) => a - b);
    const local = list.slice(k, end).map((g) => ({ ...g, wires: g.wires.map((w) => order.indexOf(w)) })); // biome-ignore format: one list
    out.push(unitaryGate(circuitUnitary(block(order.length, local)), order));
    k = end;
  }
  return out;
}

function measured(n: number, operations: readonly GateOperation[]): Circuit {
  const ends = Array.from({ length: n }, (_, k) => ({ kind: 'measure', wire: k, bit: k }) as const);
  return { ...emptyCircuit(n, n), operations: [...operations, ...ends] };
}

const pieces = (a: Circuit, b: Circuit, options: ContractOptions = {}) => {
  const sides = sidesOf(a, b, contractOf(a, options), bitPairs(a, b));
  return sides && comparePieces(sides);
};

describe('piece by piece', () => {
  test.each([
    [20, 200],
    [60, 1000],
    [200, 2000],
  ])('%i wires, %i gates in runs made one matrix each: the same', (n, count) => {
    const draw = random(n, 'pieces');
    const list = gates(n, count, draw);
    const [a, b] = [block(n, list), block(n, rewritten(list, draw))];
    const found = pieces(a, b)!;
    expect(found.hilbertSchmidt).toBeLessThan(1e-20);
    expect(compareCircuits(a, b)).toMatchObject({ verdict: 'same', proof: true });
    // and one angle off by 1e-4 in the middle is not
    const off = list.map((g, k) => (k === Math.floor(count / 2) && g.angles.length > 0 ? { ...g, angles: g.angles.map((x) => x + 1e-4) } : g)); // biome-ignore format: one list
    const changed = off.some((g, k) => g !== list[k]);
    expect(pieces(block(n, off), b) === null).toBe(changed);
  });

  test('small circuits: whenever this road says same, the dense one does', () => {
    let proofs = 0;
    for (let seed = 0; seed < 300; seed++) {
      const draw = random(seed, 'small pieces');
      const list = gates(4, 8, draw);
      // lines that change places within a piece, and at the end
      for (let k = seed % 4; k > 0; k--) list.splice(whole(draw, list.length + 1), 0, gate('swap', [k - 1, k])); // biome-ignore format: one step
      const other = rewritten(list, draw);
      if (seed % 2) {
        const at = whole(draw, other.length);
        const kind = whole(draw, 3);
        if (kind === 0) other.splice(at, 1);
        else if (kind === 1) other.splice(at, 0, gate('rz', [whole(draw, 4)], 0.01));
        else other.reverse();
      }
      const isProgram = seed % 3 === 0;
      const [a, b] = [list, other].map((operations) => (isProgram ? measured(4, operations) : block(4, operations))) as [Circuit, Circuit]; // biome-ignore format: a pair
      const options: ContractOptions = isProgram || seed % 5 ? {} : { inputs: 'zero' };
      if (!pieces(a, b, options)) continue;
      proofs++;
      expect(compareCircuits(a, b, { contract: options }).verdict).toBe('same');
    }
    expect(proofs).toBeGreaterThan(140);
  });
});
