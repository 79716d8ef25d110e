import { describe, expect, test } from 'vitest';
import { type GateOperation, gate, unitaryGate } from '../../src/circuit/circuit.ts';
import { gateTable, PAULI } from '../../src/circuit/gates.ts';
import { applyGateInto, gateMatrix } from '../../src/circuit/unitary.ts';
import { identity, kron } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { axisFinder, axisOn, isZ, sameAxis } from '../../src/survey/axes.ts';
import { restrictGate } from '../../src/survey/restrict.ts';

const axesOf = axisFinder();
const draw = random('axes');

/** The gate with its operands on 0 .. k-1, and with `place` at a basis state: k-1 wires. */
function expected(operation: GateOperation, place: number, value: boolean): Float64Array {
  const k = operation.wires.length;
  const u = gateMatrix(operation);
  const d = 2 ** k;
  const s = 2 ** (k - 1 - place);
  const states = Array.from({ length: d }, (_, r) => r).filter((r) => ((r & s) !== 0) === value);
  const half = d / 2;
  const out = new Float64Array(2 * half * half);
  states.forEach((row, i) => {
    states.forEach((column, j) => {
      out[i * half + j] = u[row * d + column]!;
      out[half * half + i * half + j] = u[d * d + row * d + column]!;
    });
  });
  return out;
}

const operations: GateOperation[] = [...gateTable.values()]
  .filter(({ wires }) => wires >= 2)
  .map(({ name, wires, angles }) => {
    const list = Array.from({ length: angles }, () => 0.3 + draw());
    return gate(
      name,
      Array.from({ length: wires }, (_, k) => k),
      ...list,
    );
  });
operations.push(
  { ...gate('p', [0, 1], 0.7), controls: [true] },
  { ...gate('p', [0, 1], 0.7), controls: [false] },
  { ...gate('cx', [0, 1, 2]), controls: [false] },
  { ...gate('rx', [0, 1, 2], 0.4), controls: [true, false] },
  { ...gate('cz', [0, 1]), power: 0.5 },
  { ...gate('swap', [0, 1, 2]), controls: [true], power: 0.5 },
);
{
  // a generic diagonal on three wires
  const matrix = new Float64Array(128);
  for (let k = 0; k < 8; k++) {
    const t = 6 * draw();
    matrix[9 * k] = Math.cos(t);
    matrix[64 + 9 * k] = Math.sin(t);
  }
  operations.push(unitaryGate(matrix, [0, 1, 2], 'diagonal'));
}

// exp(-i t/2 Z P Q) for other axes, and a turned one: bodies that turn the axes
for (const paulis of [
  [PAULI.X, PAULI.X],
  [PAULI.Y, PAULI.X],
  [PAULI.Z, PAULI.Y],
]) {
  const word = kron(PAULI.Z, kron(paulis[0]!, paulis[1]!, 2, 2), 2, 4);
  const [c, s] = [Math.cos(0.4), Math.sin(0.4)];
  const matrix = new Float64Array(128);
  for (let k = 0; k < 64; k++) {
    matrix[k] = s * word[64 + k]! + (k % 9 === 0 ? c : 0);
    matrix[64 + k] = -s * word[k]!;
  }
  operations.push(unitaryGate(matrix, [0, 1, 2], 'rotation'));
  const v = haarUnitary(2, draw);
  const turned = identity(8);
  applyGateInto(turned, { ...unitaryGate(v, [1]), power: -1 }, 3, 8);
  applyGateInto(turned, unitaryGate(matrix, [0, 1, 2]), 3, 8);
  applyGateInto(turned, unitaryGate(v, [1]), 3, 8);
  operations.push(unitaryGate(turned, [0, 1, 2], 'turned rotation'));
}

describe('restricting a gate to a known value', () => {
  test.each(
    operations.map((operation) => [`${operation.name} ${operation.controls}`, operation] as const),
  )('%s, every operand with axis z', (_, operation) => {
    axesOf(operation).forEach((axis, place) => {
      if (!isZ(axis)) return;
      for (const value of [false, true]) {
        const wanted = expected(operation, place, value);
        const rest = restrictGate(operation, place, value);
        const n = operation.wires.length - 1;
        const wires = operation.wires.filter((_, k) => k !== place);
        const local = rest && { ...rest, wires: rest.wires.map((w) => wires.indexOf(w)) };
        const got = identity(2 ** n);
        if (local) applyGateInto(got, local, n, 2 ** n);
        expect(hilbertSchmidtDistance(got, wanted).distance).toBeLessThan(1e-24);
        if (!local?.definition) continue;
        const body = identity(2 ** n);
        for (const part of local.definition.operations) applyGateInto(body, part, n, 2 ** n);
        expect(hilbertSchmidtDistance(body, wanted).distance).toBeLessThan(1e-24);
      }
    });
  });
});

describe('axes', () => {
  test('controls have z, targets x, mixtures none, and nothing all', () => {
    const names = (operation: GateOperation): string[] =>
      axesOf(operation).map((axis) =>
        typeof axis === 'string' ? axis : 'xyz'[axis.map(Math.abs).indexOf(1)]!,
      );
    expect(names(gate('cx', [0, 1]))).toEqual(['z', 'x']);
    expect(names(gate('cy', [0, 1]))).toEqual(['z', 'y']);
    expect(names(gate('ccx', [0, 1, 2]))).toEqual(['z', 'z', 'x']);
    expect(names(gate('cswap', [0, 1, 2]))).toEqual(['z', 'none', 'none']);
    expect(names(gate('swap', [0, 1]))).toEqual(['none', 'none']);
    expect(names(gate('rxx', [0, 1], 0.4))).toEqual(['x', 'x']);
    expect(names(gate('sx', [0]))).toEqual(['x']);
    expect(names(gate('iswap', [0, 1]))).toEqual(['none', 'none']);
    expect(names(gate('rxx', [0, 1], 0))).toEqual(['all', 'all']);
  });
  test.each([1, 2, 3])('any axis is found after turning the wire, seed %i', (seed) => {
    const turn = random('turn', seed);
    const [v, w] = [haarUnitary(2, turn), haarUnitary(2, turn)];
    const u = gateMatrix(gate('cx', [0, 1]));
    const before = unitaryGate(kron(v, w, 2, 2), [0, 1]);
    const local = identity(4);
    applyGateInto(local, before, 2, 4);
    const turned = local.slice();
    applyGateInto(turned, unitaryGate(u, [0, 1]), 2, 4);
    applyGateInto(turned, { ...before, power: -1 }, 2, 4);
    // v^dag (z . sigma) v has the Bloch vector that the first wire's axis must have
    const z = gateMatrix({ ...gate('z', [0]) });
    const pulled = v.slice();
    applyGateInto(pulled, unitaryGate(z, [0]), 1, 2);
    applyGateInto(pulled, { ...unitaryGate(v, [0]), power: -1 }, 1, 2);
    const bloch = [pulled[2]!, pulled[6]!, pulled[0]!] as const;
    const axis = axisOn(turned, 2, 0);
    expect(axis).not.toBe('none');
    expect(sameAxis(axis, bloch)).toBe(true);
    expect(axisOn(turned, 2, 1)).not.toBe('none');
    expect(axisOn(haarUnitary(4, turn), 2, 0)).toBe('none');
  });
});
