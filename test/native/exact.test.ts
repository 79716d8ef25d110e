import { describe, expect, test } from 'vitest';
import {
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import {
  type Canonical,
  canonical,
  canonicalGate,
  cxCount,
  makhlinInvariants,
} from '../../src/native/canonical.ts';
import { diagonalGates, isDiagonal } from '../../src/native/diagonal.ts';
import { eulerAngles, ONE_WIRE_SETS, oneWireGates } from '../../src/native/euler.ts';
import { nativeSetOf } from '../../src/native/native-set.ts';
import { toNative } from '../../src/native/to-native.ts';
import { entanglerUse, twoWireGates } from '../../src/native/two-wire.ts';
import { identity, kron, mul } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const QUARTER = Math.PI / 4;
const table = (name: string, ...angles: number[]): Float64Array =>
  gateTable.get(name)!.matrix(angles);
const gap = (a: Float64Array, b: Float64Array): number =>
  a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);
const distance = (a: Float64Array, b: Float64Array): number =>
  hilbertSchmidtDistance(a, b).distance;
const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const locals = (draw: Random): Float64Array =>
  kron(haarUnitary(2, draw), haarUnitary(2, draw), 2, 2);

describe('single-wire gates', () => {
  const special = ['id', 'x', 'y', 'z', 'h', 's', 'sdg', 't', 'sx', 'sxdg'].map((name) =>
    table(name),
  );
  const angles = [1e-14, 1e-9, 0.3, Math.PI / 2, -Math.PI / 2, Math.PI, Math.PI - 1e-9];
  const rotations = ['rx', 'ry', 'rz'].flatMap((name) => angles.map((a) => table(name, a)));
  const draw = random(1, 'euler');
  const random2 = Array.from({ length: 200 }, () => haarUnitary(2, draw));

  test.each(ONE_WIRE_SETS)('%s: recompose, with names of the set only', (set) => {
    for (const u of [...special, ...rotations, ...random2]) {
      const gates = oneWireGates(u, set);
      let made: Float64Array = identity(2);
      for (const { name, angles: a } of gates) {
        expect(set.split(',')).toContain(name);
        made = mul(table(name, ...a), made, 2);
      }
      expect(distance(u, made)).toBeLessThan(1e-25);
    }
  });

  test('the phase of the Euler angles is right', () => {
    for (const u of [...special, ...rotations, ...random2]) {
      const { t, f, l, phase } = eulerAngles(u);
      const made = mul(table('rz', f), mul(table('ry', t), table('rz', l), 2), 2);
      const found = hilbertSchmidtDistance(made, u).phase;
      expect(Math.abs(Math.sin((found - phase) / 2))).toBeLessThan(1e-14);
    }
  });

  // fewest pieces: two SX are enough for every gate (common practice, no source)
  test.each([
    ['id', 'rz,sx', 0],
    ['s', 'rz,sx', 1],
    ['h', 'rz,sx', 3],
    ['x', 'rz,sx', 2],
    ['x', 'rz,sx,x', 1],
    ['sx', 'rz,sx', 1],
    ['y', 'ry,rz', 1],
    ['h', 'u3', 1],
    ['t', 'prx,rz', 1],
  ] as const)('%s in %s takes %i', (name, set, count) => {
    expect(oneWireGates(table(name), set)).toHaveLength(count);
  });
});

function recomposed({ phase, a1, a2, b1, b2, c }: Canonical): Float64Array {
  const m = mul(mul(kron(a1, a2, 2, 2), canonicalGate(c), 4), kron(b1, b2, 2, 2), 4);
  return m.map((x, k) =>
    k < 16
      ? Math.cos(phase) * x - Math.sin(phase) * m[16 + k]!
      : Math.cos(phase) * x + Math.sin(phase) * m[k - 16]!,
  );
}

function isInChamber([c1, c2, c3]: readonly [number, number, number]): boolean {
  return c1 <= QUARTER + 1e-12 && c1 >= c2 - 1e-12 && c2 >= Math.abs(c3) - 1e-12;
}

describe('canonical decomposition', () => {
  // WIREGAUGE_LONG_TESTS=1 runs the full 100,000 and 10,000
  const [many, degenerate] = process.env.WIREGAUGE_LONG_TESTS ? [100_000, 10_000] : [3000, 2000];

  test('random gates recompose to 1e-13', () => {
    const draw = random(2, 'canonical');
    for (let k = 0; k < many; k++) {
      const u = haarUnitary(4, draw);
      const found = canonical(u);
      if (gap(u, recomposed(found)) > 1e-13 || !isInChamber(found.c)) throw new Error(`case ${k}`);
    }
  });

  test('degenerate classes recompose to 1e-13', () => {
    const draw = random(3, 'degenerate');
    const values = [0, QUARTER, QUARTER / 2, -QUARTER, 2 * QUARTER, 0.3, 1e-9, 1e-13, 1];
    const pick = (): number => values[Math.floor(draw() * values.length)]!;
    for (let k = 0; k < degenerate; k++) {
      const u = mul(mul(locals(draw), canonicalGate([pick(), pick(), pick()]), 4), locals(draw), 4);
      const found = canonical(u);
      if (gap(u, recomposed(found)) > 1e-13 || !isInChamber(found.c)) throw new Error(`case ${k}`);
    }
  });

  // Makhlin, Quantum Inf. Process. 1, 243 (2002); Zhang, Vala, Sastry, Whaley, PRA 67, 042313 (2003)
  const t = 0.7;
  test.each([
    ['cx', [], [0, 0], 1, [1, 0, 0], 1],
    ['cz', [], [0, 0], 1, [1, 0, 0], 1],
    ['ch', [], [0, 0], 1, [1, 0, 0], 1],
    ['ecr', [], [0, 0], 1, [1, 0, 0], 1],
    ['cp', [Math.PI / 2], [0.5, 0], 2, [0.5, 0, 0], 2],
    ['cp', [t], [Math.cos(t / 2) ** 2, 0], 2 + Math.cos(t), [t / Math.PI, 0, 0], 2],
    ['iswap', [], [0, 0], -1, [1, 1, 0], 2],
    ['swap', [], [-1, 0], -3, [1, 1, 1], 3],
    ['sqrtiswap', [], [0.25, 0], 1, [0.5, 0.5, 0], 2],
    ['b', [], [0, 0], 0, [1, 0.5, 0], 2],
  ] as const)(
    '%s %j: invariants, coordinates and CX count as published',
    (name, angles, g1, g2, c, cx) => {
      const u = table(name, ...angles);
      for (const gateHere of [
        u,
        mul(mul(locals(random(4, name)), u, 4), locals(random(5, name)), 4),
      ]) {
        const found = makhlinInvariants(gateHere);
        expect(found.g1[0]).toBeCloseTo(g1[0], 12);
        expect(found.g1[1]).toBeCloseTo(g1[1], 12);
        expect(found.g2).toBeCloseTo(g2, 12);
        const { c: coordinates } = canonical(gateHere);
        coordinates.forEach((x, k) => {
          expect(x / QUARTER).toBeCloseTo(c[k]!, 7);
        });
        expect(cxCount(coordinates)).toBe(cx);
      }
    },
  );
});

describe('two-wire gates in uses of an entangler', () => {
  const draw = random(6, 'two');
  const cases: [string, Float64Array][] = [
    ...Array.from({ length: 30 }, (): [string, Float64Array] => ['random', haarUnitary(4, draw)]),
    ...['cx', 'cz', 'swap', 'iswap', 'sqrtiswap', 'b', 'ecr', 'ch', 'csx'].map(
      (name): [string, Float64Array] => [name, table(name)],
    ),
    ['local', locals(draw)],
  ];
  test.each(['cx', 'cz', 'ecr', 'cy'])('%s: exact, and at most three', (name) => {
    const use = entanglerUse({ name });
    for (const [label, u] of cases) {
      const gates = twoWireGates(u, use)!;
      expect(distance(u, unitaryOf(gates, 2))).toBeLessThan(1e-24);
      const uses = gates.filter(({ wires }) => wires.length === 2);
      expect(uses.every((operation) => operation.name === name)).toBe(true);
      expect(uses.length, label).toBe(cxCount(canonical(u).c));
    }
  });

  test.each(['rxx', 'rzz', 'cp', 'crx'])('%s of free angle: one use per coordinate', (name) => {
    const use = entanglerUse({ name, angle: 'free' });
    for (const [label, u] of cases) {
      const gates = twoWireGates(u, use)!;
      expect(distance(u, unitaryOf(gates, 2)), label).toBeLessThan(1e-24);
      const count = canonical(u).c.filter((x) => Math.abs(x) > 1e-9).length;
      expect(gates.filter(({ wires }) => wires.length === 2)).toHaveLength(count);
    }
  });
});

describe('diagonals', () => {
  test.each([1, 2, 3, 4, 5])('%i wires: exact with at most 2^n - 2 CX', (n) => {
    // Bullock, Markov, QIC 4, 27 (2004)
    const d = 2 ** n;
    const draw = random(n, 'diagonal');
    const u = new Float64Array(2 * d * d);
    for (let k = 0; k < d; k++) {
      const phase = 6 * draw();
      u[k * d + k] = Math.cos(phase);
      u[d * d + k * d + k] = Math.sin(phase);
    }
    expect(isDiagonal(u, n)).toBe(true);
    const gates = diagonalGates(u, n);
    expect(distance(u, unitaryOf(gates, n))).toBeLessThan(1e-25);
    const cx = gates.filter(({ name }) => name === 'cx').length;
    expect(cx).toBe(n === 1 ? 0 : d - 2);
  });

  test('angles that are zero cost nothing', () => {
    expect(diagonalGates(identity(8), 3)).toEqual([]);
    const u = unitaryOf([gate('rzz', [0, 2], 0.4)], 3);
    const gates = diagonalGates(u, 3);
    expect(distance(u, unitaryOf(gates, 3))).toBeLessThan(1e-26);
    expect(gates.filter(({ name }) => name === 'cx')).toHaveLength(2);
  });
});

describe('toNative', () => {
  const names = [
    'h',
    't',
    'rx',
    'u3',
    'cx',
    'swap',
    'cp',
    'crx',
    'ccx',
    'cswap',
    'rccx',
    'c3x',
    'ccz',
  ];
  function randomGates(n: number, length: number, draw: Random): GateOperation[] {
    const usable = names.filter((name) => gateTable.get(name)!.wires <= n);
    return Array.from({ length }, () => {
      const entry = gateTable.get(usable[Math.floor(draw() * usable.length)]!)!;
      const wires = Array.from({ length: n }, (_, k) => k).sort(() => draw() - 0.5);
      const angles = Array.from({ length: entry.angles }, () => 6 * draw());
      return gate(entry.name, wires.slice(0, entry.wires), ...angles);
    });
  }

  test.each(['cx,rz,sx', 'cz,u3', 'ecr,rz,sx,x', 'rzz,prx,rz', 'cx,ry,rz'])(
    '%s: equal, in names of the set only',
    (list) => {
      const set = nativeSetOf(list);
      for (let seed = 0; seed < 12; seed++) {
        const operations = randomGates(4, 8, random(seed, list));
        const native = toNative(operations, 4, set);
        for (const operation of native) {
          expect(list.split(',')).toContain((operation as GateOperation).name);
        }
        expect(distance(unitaryOf(operations, 4), unitaryOf(native, 4))).toBeLessThan(1e-23);
      }
    },
  );

  test('extra controls, negated ones, powers and matrices', () => {
    const set = nativeSetOf('cx,rz,sx');
    const operations: GateOperation[] = [
      { ...gate('rx', [0, 2, 1], 0.7), controls: [true, false] },
      { ...gate('h', [3, 0, 1, 2]), controls: [true, true, false] },
      { ...gate('x', [1]), power: 0.5 },
      { ...gate('swap', [0, 1, 2]), controls: [true] },
      unitaryGate(haarUnitary(4, random(8)), [3, 1]),
    ];
    const native = toNative(operations, 4, set);
    expect(distance(unitaryOf(operations, 4), unitaryOf(native, 4))).toBeLessThan(1e-23);
  });

  test('neighbours on one pair are joined: swap after a controlled phase takes three CX', () => {
    const native = toNative(
      [gate('cp', [0, 1], 0.4), gate('swap', [0, 1])],
      2,
      nativeSetOf('cx,rz,sx'),
    );
    expect(native.filter(({ kind }) => kind === 'gate')).not.toHaveLength(0);
    expect(native.filter((o) => o.kind === 'gate' && o.wires.length === 2)).toHaveLength(3);
  });

  test('measurements, resets, conditions and annotations keep their places', () => {
    const condition = { kind: 'bit', bit: 0 } as const;
    const operations: Operation[] = [
      gate('h', [0]),
      { kind: 'measure', wire: 0, bit: 0, annotations: ['wiregauge.leaves 0'] },
      { kind: 'reset', wire: 0 },
      { ...gate('cp', [0, 1], 0.3), condition },
      { kind: 'assign', bit: 0, value: { kind: 'not', of: condition } },
    ];
    const native = toNative(operations, 2, nativeSetOf('cx,rz,sx'));
    const kinds = native.map(({ kind }) => kind);
    expect(kinds.indexOf('measure')).toBeLessThan(kinds.indexOf('reset'));
    expect(kinds.at(-1)).toBe('assign');
    const measured = native.find(({ kind }) => kind === 'measure')!;
    expect(measured.annotations).toEqual(['wiregauge.leaves 0']);
    const after = native.slice(kinds.indexOf('reset') + 1, -1);
    expect(after.every((operation) => operation.condition === condition)).toBe(true);
    expect(distance(table('cp', 0.3), unitaryOf(after.map(({ condition: _, ...rest }) => rest as Operation), 2))).toBeLessThan(1e-25); // biome-ignore format: one check
  });

  test.each([
    ['cx,rz,sxx', 'unknown gate in the native set: sxx (did you mean sx?)'],
    ['rz,sx', 'expected exactly one two-wire gate in the native set, got 0'],
    ['cx,cz,rz,sx', 'got 2 in cx,cz,rz,sx'],
    ['cx,rz', 'expected single-wire gates from one of the sets known, got rz'],
    ['cu,u3', 'expected a two-wire gate with at most one angle, got cu with 4'],
  ])('%s is refused', (list, message) => {
    expect(() => nativeSetOf(list)).toThrow(message);
  });
});
