import { describe, expect, test } from 'vitest';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import type { Device } from '../../src/device/device.ts';
import { placeCircuit } from '../../src/device/placement.ts';
import { routeCircuit } from '../../src/device/routing.ts';
import { InputError } from '../../src/input-error.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';

const deviceOf = (size: number, pairs: readonly [number, number][]): Device => ({
  name: 'test',
  wires: Array.from({ length: size }, () => ({})),
  links: pairs.map((between) => ({ between })),
});
const line = (size: number): Device =>
  deviceOf(
    size,
    Array.from({ length: size - 1 }, (_, k) => [k, k + 1]),
  );

function randomCircuit(n: number, gates: number, seed: number): Circuit {
  const draw = random(seed, 'routing');
  const operations: Operation[] = [];
  for (let k = 0; k < gates; k++) {
    const a = Math.floor(n * draw());
    const b = (a + 1 + Math.floor((n - 1) * draw())) % n;
    operations.push(gate('ry', [a], draw()), gate('cx', [a, b]), gate('rz', [b], draw()));
  }
  return { ...emptyCircuit(n), operations };
}

/** The unitary that carries wire k's qubit to wire places[k]; wires beyond are filled up in order. */
function permutationCircuit(n: number, places: readonly number[]): Circuit {
  const operations: Operation[] = [];
  const at = Array.from({ length: n }, (_, k) => k);
  const full = [...places, ...at.filter((w) => !places.includes(w))];
  for (let k = 0; k < n; k++) {
    const here = at[k]!;
    const there = full[k]!;
    if (here === there) continue;
    operations.push(gate('swap', [here, there]));
    const other = at.indexOf(there);
    at[k] = there;
    at[other] = here;
  }
  return { ...emptyCircuit(n), operations };
}

describe('routing', () => {
  test.each([1, 2, 3, 4])('seed %i: every gate on a link, and the same unitary', (seed) => {
    const n = 4;
    const circuit = randomCircuit(n, 12, seed);
    const device = line(n);
    const {
      circuit: routed,
      placement,
      finalPlacement,
      swaps,
    } = routeCircuit(circuit, device, [2, 0, 3, 1]);
    for (const operation of routed.operations) {
      if (operation.kind !== 'gate' || operation.wires.length < 2) continue;
      expect(Math.abs(operation.wires[0]! - operation.wires[1]!)).toBe(1);
    }
    expect(swaps).toBe(
      routed.operations.filter((o) => o.kind === 'gate' && o.name === 'swap').length,
    );
    // enter at `placement`, run, and come back from `finalPlacement`: the original
    const enter = permutationCircuit(n, placement).operations;
    const back = [...permutationCircuit(n, finalPlacement).operations].reverse();
    const whole = { ...routed, operations: [...enter, ...routed.operations, ...back] };
    const { distance } = hilbertSchmidtDistance(circuitUnitary(circuit), circuitUnitary(whole));
    expect(distance).toBeLessThan(1e-25);
  });

  test('a device in pieces is refused in words', () => {
    const pieces = deviceOf(4, [
      [0, 1],
      [2, 3],
    ]);
    expect(() => routeCircuit(randomCircuit(4, 8, 1), pieces, [0, 1, 2, 3])).toThrow(
      /got a device in pieces/,
    );
    expect(() => routeCircuit(randomCircuit(4, 8, 1), line(3), [0, 1, 2])).toThrow(InputError);
  });
});

describe('placement', () => {
  test('a chain of gates finds a path through a grid without any swap', () => {
    const grid = deviceOf(9, [
      [0, 1],
      [1, 2],
      [3, 4],
      [4, 5],
      [6, 7],
      [7, 8],
      [0, 3],
      [3, 6],
      [1, 4],
      [4, 7],
      [2, 5],
      [5, 8],
    ]);
    const operations = Array.from({ length: 8 }, (_, k) => gate('cx', [k, k + 1]));
    const chain = { ...emptyCircuit(9), operations };
    expect(placeCircuit(chain, grid).swaps).toBe(0);
  });

  test('a star on a line needs swaps, and gets a working circuit', () => {
    const operations = [1, 2, 3, 4].map((k) => gate('cx', [k, 0]));
    const placed = placeCircuit({ ...emptyCircuit(5), operations }, line(5));
    // the centre meets at most two neighbours without a swap: at least one for each further pair
    expect(placed.swaps).toBeGreaterThanOrEqual(1);
    expect(placed.swaps).toBeLessThanOrEqual(2);
  });

  test('the better wires are chosen', () => {
    const device: Device = {
      name: 'uneven',
      wires: Array.from({ length: 4 }, () => ({ readoutError: 0.01 })),
      links: [
        { between: [0, 1], error: 0.02 },
        { between: [1, 2], error: 0.01 },
        { between: [2, 3], error: 0.001 },
      ],
    };
    const circuit = { ...emptyCircuit(2), operations: [gate('cx', [0, 1])] };
    const { placement, estimate } = placeCircuit(circuit, device);
    expect([...placement].sort()).toEqual([2, 3]);
    expect(estimate.success).toBeCloseTo(1 - 1.25 * 0.001, 12);
  });
});
