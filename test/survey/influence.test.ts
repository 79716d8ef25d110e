import { describe, expect, test } from 'vitest';
import { emptyCircuit, type GateOperation, gate, unitaryGate } from '../../src/circuit/circuit.ts';
import { PAULI } from '../../src/circuit/gates.ts';
import { applyMatrixInto, circuitUnitary } from '../../src/circuit/unitary.ts';
import { adjoint, identity, kron, mul, normSquared } from '../../src/numeric/complex-matrix.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { influenceFloor, influenceTables } from '../../src/survey/influence.ts';
import { structuralRelation } from '../../src/survey/light-cones.ts';
import { probeTables } from '../../src/survey/probes.ts';
import { relates, relationFromTable } from '../../src/survey/relation.ts';

/** s_P^2 straight from the definition: ||P' - Tr_j P' x 1/2||^2 / d. */
function partOfPauli(
  u: Float64Array,
  n: number,
  pauli: 'X' | 'Y' | 'Z',
  i: number,
  j: number,
): number {
  const d = 2 ** n;
  const moved = applyMatrixInto(u.slice(), PAULI[pauli], [i], n, d);
  const pulled = mul(adjoint(u, d), moved, d);
  // averaging over the four Paulis on wire j is the same as Tr_j x 1/2
  const average = new Float64Array(pulled.length);
  for (const q of ['I', 'X', 'Y', 'Z'] as const) {
    let full = identity(1);
    for (let k = 0; k < n; k++) full = kron(full, k === j ? PAULI[q] : identity(2), 2 ** k, 2);
    const turned = mul(full, mul(pulled, full, d), d);
    for (let k = 0; k < average.length; k++) average[k]! += turned[k]! / 4;
  }
  return normSquared(pulled.map((x, k) => x - average[k]!)) / d;
}

describe('influence tables', () => {
  test.each([2, 3, 4])('hold what they are defined as, %i wires', (n) => {
    const u = haarUnitary(2 ** n, random('haar', n));
    const { kept, measured } = influenceTables(u, n);
    for (let i = 0; i < n; i++) {
      for (let j = 0; j < n; j++) {
        const parts = (['X', 'Y', 'Z'] as const).map((p) => partOfPauli(u, n, p, i, j));
        expect(kept[i * n + j]).toBeCloseTo((parts[0]! + parts[1]! + parts[2]!) / 8, 12);
        expect(measured[i * n + j]).toBeCloseTo(Math.sqrt(parts[2]!) / 2, 12);
      }
    }
  });

  test('light cones leave nothing out', () => {
    const n = 5;
    const pairs = [
      [0, 1],
      [3, 4],
      [1, 2],
    ];
    const draw = random('cones');
    const operations = pairs.map((wires) => unitaryGate(haarUnitary(4, draw), wires));
    const circuit = { ...emptyCircuit(n), operations };
    const u = circuitUnitary(circuit);
    const whole = influenceTables(u, n);
    const short = influenceTables(u, n, structuralRelation(circuit));
    for (let k = 0; k < n * n; k++) {
      expect(short.kept[k]).toBeCloseTo(whole.kept[k]!, 13);
      expect(short.measured[k]).toBeCloseTo(whole.measured[k]!, 13);
    }
  });

  test('a CX frees its control of the target as measured, not as kept', () => {
    const u = circuitUnitary({ ...emptyCircuit(2), operations: [gate('cx', [0, 1])] });
    const { kept, measured } = influenceTables(u, 2);
    expect(kept[1]).toBeGreaterThan(0.1);
    expect(measured[1]).toBe(0);
    expect(measured[2]).toBeGreaterThan(0.1);
  });

  test.each([4, 6])('zeros of a scrambled chain stay below the floor, %i wires', (n) => {
    // output 0 leaves before input n - 1 enters; entries of the matrix are noisy by 1e-13
    const draw = random('chain', n);
    const left = Array.from({ length: n - 1 }, (_, k) => k);
    const circuit = {
      ...emptyCircuit(n),
      operations: [
        unitaryGate(haarUnitary(2 ** (n - 1), draw), left),
        unitaryGate(
          haarUnitary(2 ** (n - 1), draw),
          left.map((k) => k + 1),
        ),
      ],
    };
    for (const noise of [0, 1e-13]) {
      const u = circuitUnitary(circuit).map((x) => x + noise * (draw() - 0.5));
      const { kept, measured } = influenceTables(u, n);
      for (let i = 0; i < n; i++) {
        for (let j = 0; j < n; j++) {
          const isFree = i === 0 && j === n - 1;
          expect(kept[i * n + j]! > influenceFloor(n)).toBe(!isFree);
          expect(measured[i * n + j]! > Math.sqrt(influenceFloor(n))).toBe(!isFree);
        }
      }
    }
  });
});

describe('probes', () => {
  test.each([1, 2, 3])('see what the dense table sees, seed %i', (seed) => {
    const n = 5;
    const draw = random('probe test', seed);
    const operations: GateOperation[] = [];
    for (let k = 0; k < 8; k++) {
      const a = Math.floor(draw() * n);
      const b = (a + 1 + Math.floor(draw() * (n - 1))) % n;
      const name = ['cx', 'cz', 'rxx', 'cp'][k % 4]!;
      operations.push(gate(name, [a, b], ...(k % 4 >= 2 ? [1 + draw()] : [])));
      if (k % 3 === 0) operations.push(gate('h', [b]));
    }
    const circuit = { ...emptyCircuit(n), operations };
    const dense = influenceTables(circuitUnitary(circuit), n);
    const probed = probeTables(circuit, { seed });
    const keptDense = relationFromTable(dense.kept, n, influenceFloor(n));
    const keptProbed = relationFromTable(probed.kept, n, 1e-9);
    const bitsDense = relationFromTable(dense.measured, n, Math.sqrt(influenceFloor(n)));
    const bitsProbed = relationFromTable(probed.measured, n, 1e-9);
    for (let i = 0; i < n; i++) {
      for (let j = 0; j < n; j++) {
        expect(relates(keptProbed, i, j)).toBe(relates(keptDense, i, j));
        expect(relates(bitsProbed, i, j)).toBe(relates(bitsDense, i, j));
        expect(probed.measured[i * n + j]!).toBeLessThanOrEqual(0.5 + 1e-12);
        expect(probed.measured[i * n + j]!).toBeLessThanOrEqual(probed.kept[i * n + j]! + 1e-12);
      }
    }
  });
});
