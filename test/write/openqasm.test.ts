import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  type BitExpression,
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { circuitUnitary, gateMatrix } from '../../src/circuit/unitary.ts';
import { InputError } from '../../src/input-error.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { angleText, decimalText } from '../../src/write/numbers.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';

const WIRES = 5;
const BITS = 4;
const RUNS = { seed: 51, numRuns: 300 };

/** A circuit without places in a text and without a language: what must come back. */
function bare(circuit: Circuit): unknown {
  const { wires, bits, operations, globalPhase, qubitRegisters, bitRegisters } = circuit;
  const clean = operations.map(({ line, column, ...rest }) => rest);
  return { wires, bits, operations: clean, globalPhase, qubitRegisters, bitRegisters };
}

const again = (circuit: Circuit, language: '2.0' | '3' = '3'): Circuit =>
  readCircuit(writeCircuit(circuit, { language }), circuit.name).circuit;

const angle = fc
  .oneof(
    fc.double({ min: -1e6, max: 1e6, noNaN: true }),
    fc.double({ min: -1e-300, max: 1e-300, noNaN: true }),
    fc
      .tuple(fc.integer({ min: -32, max: 32 }), fc.constantFrom(1, 2, 3, 4, 8, 16))
      .map(([n, m]) => (n * Math.PI) / m),
  )
  .map((x) => (x === 0 ? 0 : x));

const wireOrder = (wires: number): fc.Arbitrary<number[]> =>
  fc.shuffledSubarray(
    Array.from({ length: WIRES }, (_, k) => k),
    { minLength: wires, maxLength: wires },
  );

const gateOperation: fc.Arbitrary<GateOperation> = fc
  .constantFrom(...gateTable.values())
  .chain((entry) =>
    fc
      .record({
        wires: wireOrder(entry.wires),
        angles: fc.array(angle, { minLength: entry.angles, maxLength: entry.angles }),
      })
      .map(({ wires, angles }) => gate(entry.name, wires, ...angles)),
  );

/** Modified gates in the form in which the reader leaves them: nothing that has a shorter name. */
const modifiedOperation: fc.Arbitrary<GateOperation> = fc
  .record({
    name: fc.constantFrom('s', 'u3', 'iswap', 'sx', 'prx'),
    controls: fc.array(fc.boolean(), { maxLength: 3 }),
    power: fc.constantFrom(2, 7, 0.5, -0.25, 1 / 3, 1.75),
    order: wireOrder(WIRES),
    angles: fc.array(angle, { minLength: 3, maxLength: 3 }),
  })
  .map(({ name, controls, power, order, angles }) => {
    const entry = gateTable.get(name)!; // the names above are in the table
    return {
      ...gate(
        name,
        order.slice(0, entry.wires + controls.length),
        ...angles.slice(0, entry.angles),
      ),
      controls,
      power,
    };
  });

const bit: fc.Arbitrary<BitExpression> = fc.record({
  kind: fc.constant('bit' as const),
  bit: fc.nat(BITS - 1),
});
/** Expressions without constants and double negations, which a reader would not keep. */
const expression: fc.Arbitrary<BitExpression> = fc.letrec<{
  any: BitExpression;
  many: BitExpression;
}>((tie) => ({
  many: fc.record({
    kind: fc.constantFrom('and', 'or', 'xor'),
    of: fc.array(tie('any'), { minLength: 2, maxLength: 4 }),
  }),
  any: fc.oneof(
    { depthSize: 'small', withCrossShrink: true },
    bit,
    bit.map((of): BitExpression => ({ kind: 'not', of })),
    tie('many'),
    tie('many').map((of): BitExpression => ({ kind: 'not', of })),
  ),
})).any;

const operation: fc.Arbitrary<Operation> = fc
  .oneof(
    { weight: 4, arbitrary: gateOperation as fc.Arbitrary<Operation> },
    { weight: 2, arbitrary: modifiedOperation },
    fc.record({
      kind: fc.constant('measure' as const),
      wire: fc.nat(WIRES - 1),
      bit: fc.integer({ min: -1, max: BITS - 1 }),
    }),
    fc.record({ kind: fc.constant('reset' as const), wire: fc.nat(WIRES - 1) }),
    fc.record({ kind: fc.constant('assign' as const), bit: fc.nat(BITS - 1), value: expression }),
    fc
      .integer({ min: 1, max: WIRES })
      .chain(wireOrder)
      .map((wires) => ({ kind: 'barrier' as const, wires })),
  )
  .chain((op) =>
    fc
      .record({
        condition: fc.option(expression, { nil: undefined, freq: 2 }),
        annotations: fc.option(
          fc.array(fc.constantFrom('wiregauge.enters 3', 'valley.note weir 7'), {
            minLength: 1,
            maxLength: 2,
          }),
          { nil: undefined, freq: 4 },
        ),
      })
      .map(({ condition, annotations }) => ({
        ...op,
        ...(condition ? { condition } : {}),
        ...(annotations ? { annotations } : {}),
      })),
  );

const circuit: fc.Arbitrary<Circuit> = fc
  .record({
    operations: fc.array(operation, { maxLength: 25 }),
    globalPhase: fc.oneof(fc.constant(0), angle),
  })
  .map(({ operations, globalPhase }) => ({
    ...emptyCircuit(WIRES, BITS, 'gauge.qasm'),
    bitRegisters: [
      { name: 'flag', first: 0, size: 1, scalar: true },
      { name: 'out', first: 1, size: BITS - 1, scalar: false },
    ],
    operations,
    globalPhase,
  }));

describe('OpenQASM 3', () => {
  test('what is written reads back to the same circuit (fast-check, seed 51)', () => {
    fc.assert(
      fc.property(circuit, (c) => {
        expect(bare(again(c))).toEqual(bare(c));
      }),
      RUNS,
    );
  });

  test('every gate of the table reads back to itself, also under modifiers', () => {
    for (const entry of gateTable.values()) {
      const angles = Array.from({ length: entry.angles }, (_, k) => 0.3 * k - 0.7);
      const wires = [3, 1, 4, 0, 2].slice(0, entry.wires);
      const plain = { ...emptyCircuit(6), operations: [gate(entry.name, wires, ...angles)] };
      expect(bare(again(plain))).toEqual(bare(plain));
      const modified = {
        ...gate(entry.name, [5, ...wires], ...angles),
        controls: [false],
        power: 0.5,
      };
      const other = { ...emptyCircuit(6), operations: [modified] };
      expect(bare(again(other))).toEqual(bare(other));
    }
  });

  test('written text is stable: writing what was read gives the same text', () => {
    fc.assert(
      fc.property(circuit, (c) => {
        const text = writeCircuit(c);
        expect(writeCircuit(readCircuit(text, 'x').circuit)).toBe(text);
      }),
      { ...RUNS, numRuns: 60 },
    );
  });

  test('the text as people see it', () => {
    const condition = { kind: 'bit', bit: 0 } as const;
    const operations: Operation[] = [
      { kind: 'reset', wire: 0, annotations: ['wiregauge.enters 2'] },
      gate('iswap', [0, 1]),
      gate('rz', [1], -Math.PI / 4),
      { ...gate('x', [0, 1, 2]), controls: [true, false] },
      { kind: 'barrier', wires: [0, 1, 2] },
      { kind: 'measure', wire: 0, bit: 0 },
      { ...gate('u3', [1], 0.1, 2e-7, Math.PI), condition },
      { ...gate('h', [2]), condition },
      { kind: 'assign', bit: 1, value: { kind: 'xor', of: [condition, { kind: 'bit', bit: 1 }] } },
    ];
    const c: Circuit = { ...emptyCircuit(3, 2), operations, globalPhase: Math.PI / 3 };
    expect(writeCircuit(c, { comments: ['river gauge 7', ''] })).toBe(`// river gauge 7
//
OPENQASM 3.0;
include "stdgates.inc";

gate iswap a, b { cx a, b; crx(-pi) b, a; cx a, b; }

qubit[3] q;
bit[2] c;

gphase(pi/3);
@wiregauge.enters 2
reset q[0];
iswap q[0], q[1];
rz(-pi/4) q[1];
ctrl @ negctrl @ x q[0], q[1], q[2];
barrier q;
c[0] = measure q[0];
if (c[0]) {
  u3(0.1, 2e-7, pi) q[1];
  h q[2];
}
c[1] = c[0] ^ c[1];
`);
  });

  test('a condition that its own body changes ends the block', () => {
    const condition = { kind: 'bit', bit: 0 } as const;
    const c: Circuit = {
      ...emptyCircuit(1, 1),
      operations: [
        { ...gate('x', [0]), condition },
        { kind: 'measure', wire: 0, bit: 0, condition },
        { ...gate('z', [0]), condition },
      ],
    };
    expect(bare(again(c))).toEqual(bare(c));
  });

  test('hidden registers stay hidden', () => {
    const hidden = { name: 'kept', first: 1, size: 2, scalar: false, hidden: true } as const;
    const plain = emptyCircuit(1, 1);
    const c: Circuit = { ...plain, bits: 3, bitRegisters: [...plain.bitRegisters, hidden] };
    expect(writeCircuit(c)).toContain('bit[1] c;\n@wiregauge.hidden\nbit[2] kept;');
    expect(bare(again(c))).toEqual(bare(c));
  });

  test('names that the language needs for itself are changed', () => {
    const c: Circuit = {
      ...emptyCircuit(2, 1),
      qubitRegisters: [
        { name: 'gate', first: 0, size: 1, scalar: false },
        { name: 'h', first: 1, size: 1, scalar: true },
      ],
      bitRegisters: [{ name: 'gate', first: 0, size: 1, scalar: false }],
      operations: [gate('cx', [0, 1]), { kind: 'measure', wire: 1, bit: 0 }],
    };
    const text = writeCircuit(c);
    expect(text).toContain('qubit[1] gate_;\nqubit h_;\nbit[1] gate__;');
    expect(again(c).operations.length).toBe(2);
  });

  test('registers that do not cover the circuit are replaced', () => {
    const c: Circuit = { ...emptyCircuit(2), wires: 3, operations: [gate('h', [2])] };
    expect(writeCircuit(c)).toContain('qubit[3] q;\n\nh q[2];');
  });
});

describe('gates given by their matrix', () => {
  const difference = (a: Float64Array, b: Float64Array): number =>
    a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);

  test('on one wire: U and a phase, exact to rounding (seed 52)', () => {
    const draw = random(52);
    const special = ['x', 'z', 'h', 's', 'y', 'id'].map((name) => gateTable.get(name)!.matrix([]));
    const list = [...special, ...Array.from({ length: 50 }, () => haarUnitary(2, draw))];
    for (const matrix of list) {
      const operation = { ...unitaryGate(matrix, [1, 0], 'turn'), controls: [true] };
      const c: Circuit = { ...emptyCircuit(2), operations: [operation] };
      const back = circuitUnitary(again(c));
      expect(difference(back, circuitUnitary(c))).toBeLessThan(1e-14);
    }
  });

  test('two gates of one label get two names, the same gate one', () => {
    const [a, b] = [haarUnitary(2, random(53)), haarUnitary(2, random(54))];
    const operations = [
      unitaryGate(a, [0], 'turn'),
      unitaryGate(b, [0], 'turn'),
      unitaryGate(a.slice(), [1], 'turn'),
    ];
    const text = writeCircuit({ ...emptyCircuit(2), operations });
    expect(text.match(/^gate .*/gm)).toEqual(['gate turn w0 {', 'gate turn_2 w0 {']);
    expect(text).toContain('turn q[0];\nturn_2 q[0];\nturn q[1];');
  });

  test('on more wires a body is needed: with the operation, or by the options', () => {
    const body = [
      gate('h', [0]),
      gate('iswap', [1, 0]),
      { ...gate('t', [1, 0]), controls: [false] },
    ];
    const inner: Circuit = { ...emptyCircuit(2), operations: body, globalPhase: 0.4 };
    const operation = { ...unitaryGate(circuitUnitary(inner), [2, 0], 'block 7'), power: 0.5 };
    const c: Circuit = { ...emptyCircuit(3), operations: [operation] };
    expect(() => writeCircuit(c)).toThrow('gate block 7 on 2 wires is known by its matrix only');
    const byOption = writeCircuit(c, { definitions: new Map([['block 7', { body, phase: 0.4 }]]) });
    const own = {
      ...c,
      operations: [{ ...operation, definition: { operations: body, phase: 0.4 } }],
    };
    expect(writeCircuit(own)).toBe(byOption);
    expect(byOption).toContain('pow(0.5) @ block_7 q[2], q[0];');
    const back = readCircuit(byOption, 'x').circuit;
    expect(difference(circuitUnitary(back), circuitUnitary(c))).toBeLessThan(1e-13);
    expect(back.operations[0]).toMatchObject({ name: 'unitary', power: 0.5, label: 'block_7' });
    const [again] = back.operations;
    expect(again?.kind === 'gate' && gateMatrix(again).length).toBe(32);
  });

  test('unknown gates are told', () => {
    const c: Circuit = {
      ...emptyCircuit(1),
      operations: [{ ...gate('warp', [0]), line: 3, column: 5 }],
    };
    expect(() => writeCircuit(c)).toThrow(InputError);
    expect(() => writeCircuit(c)).toThrow('unknown gate: warp at 3:5');
  });
});

describe('OpenQASM 2.0', () => {
  test('every gate of the table reads back to itself', () => {
    for (const entry of gateTable.values()) {
      const angles = Array.from({ length: entry.angles }, (_, k) => 0.3 * k - 0.7);
      const wires = [3, 1, 4, 0, 2].slice(0, entry.wires);
      const c: Circuit = { ...emptyCircuit(5), operations: [gate(entry.name, wires, ...angles)] };
      expect(bare(again(c, '2.0'))).toEqual(bare(c));
    }
  });

  test('cross-read: a unitary circuit means the same in both languages, up to phase (seed 55)', () => {
    const gates = fc.array(gateOperation, { maxLength: 12 });
    fc.assert(
      fc.property(gates, (operations) => {
        // cu3 has a meaning of its own in each copy of the header
        const kept = operations.filter(
          ({ name, angles }) => name !== 'cu3' && angles.every((x) => Math.abs(x) < 1e6),
        );
        const c: Circuit = { ...emptyCircuit(WIRES), operations: kept };
        const [old, now] = [circuitUnitary(again(c, '2.0')), circuitUnitary(again(c))];
        expect(hilbertSchmidtDistance(old, now).distance).toBeLessThan(1e-24);
      }),
      { seed: 55, numRuns: 60 },
    );
  });

  test('measurement, reset, barrier, conditions on whole registers', () => {
    const whole = {
      kind: 'and',
      of: [
        { kind: 'bit', bit: 0 },
        { kind: 'not', of: { kind: 'bit', bit: 1 } },
      ],
    } as const;
    const c: Circuit = {
      ...emptyCircuit(2, 2),
      operations: [
        gate('u3', [0], 1e-7, Math.PI / 2, -3),
        { kind: 'barrier', wires: [1, 0] },
        { kind: 'measure', wire: 0, bit: 1 },
        { kind: 'reset', wire: 1 },
        { ...gate('x', [1]), condition: whole },
      ],
    };
    const text = writeCircuit(c, { language: '2.0' });
    expect(text).toContain(
      'u3(1.0e-7,pi/2,-3) q[0];\nbarrier q[1],q[0];\nmeasure q[0] -> c[1];\nreset q[1];\nif(c==1) x q[1];',
    );
    expect(bare(again(c, '2.0'))).toEqual(bare(c));
  });

  const bitZero = { kind: 'bit', bit: 0 } as const;
  test.each<[string, Operation]>([
    ['the modifiers ctrl @', { ...gate('t', [0, 1]), controls: [true] }],
    ['the modifiers pow(0.5) @', { ...gate('t', [0]), power: 0.5 }],
    ['the condition (c[0])', { ...gate('t', [0]), condition: bitZero }],
    ['an assignment of a bit', { kind: 'assign', bit: 0, value: bitZero }],
    ['a measurement without a bit', { kind: 'measure', wire: 0, bit: -1 }],
  ])('cannot say %s', (what, operation) => {
    const c: Circuit = { ...emptyCircuit(2, 2), operations: [operation] };
    expect(() => writeCircuit(c, { language: '2.0' })).toThrow(`OpenQASM 2.0 cannot say ${what}`);
  });
});

describe('numbers', () => {
  test.each([
    [Math.PI, 'pi'],
    [-Math.PI, '-pi'],
    [Math.PI / 2, 'pi/2'],
    [(-3 * Math.PI) / 4, '-3*pi/4'],
    [(5 * Math.PI) / 3, '5*pi/3'],
    [0, '0'],
    [0.1, '0.1'],
    [-2.5, '-2.5'],
    [3, '3'],
    [1e22, '1e+22'],
    [2 ** 60, '1152921504606847000.0'],
    [1.5e-9, '1.5e-9'],
    [Math.PI / 4 + 1e-17, 'pi/4'],
    [Math.PI / 4 + 1.2e-16, '0.7853981633974484'],
  ])('%d is %s', (value, text) => {
    expect(angleText(value)).toBe(text);
  });

  test('any double reads back to itself (fast-check, seed 56)', () => {
    const number = fc.oneof(fc.double({ noNaN: true, noDefaultInfinity: true }), angle);
    fc.assert(
      fc.property(number, fc.constantFrom('2.0' as const, '3' as const), (value, language) => {
        const c: Circuit = { ...emptyCircuit(1), operations: [gate('rx', [0], value)] };
        const [back] = again(c, language).operations;
        expect(back?.kind === 'gate' && back.angles[0]).toBe(value === 0 ? 0 : value);
      }),
      { seed: 56, numRuns: 500 },
    );
    expect(decimalText(1e-7, '2.0')).toBe('1.0e-7');
  });
});
