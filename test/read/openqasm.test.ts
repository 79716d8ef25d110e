import { describe, expect, test } from 'vitest';
import {
  bitName,
  type Circuit,
  type GateOperation,
  type Operation,
  visibleBits,
  wireName,
} from '../../src/circuit/circuit.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { circuitUnitary, gateMatrix } from '../../src/circuit/unitary.ts';
import { mul } from '../../src/numeric/complex-matrix.ts';
import { unitaryPower } from '../../src/numeric/unitary-eigen.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { conditionText } from '../../src/write/condition-text.ts';

const HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n';
const HEAD_2 = 'OPENQASM 2.0;\ninclude "qelib1.inc";\n';

const read = (body: string): Circuit => readCircuit(HEAD + body, 'test.qasm').circuit;
const read2 = (body: string): Circuit => readCircuit(HEAD_2 + body, 'test.qasm').circuit;
const warningsOf = (text: string): string[] =>
  readCircuit(text, 'test.qasm').warnings.map(
    ({ message, line, column }) => `${line}:${column} ${message}`,
  );

/** One operation in short: `cx q[0] q[1]`, `c[0] = measure q[1]`, with its condition in front. */
function say(circuit: Circuit, operation: Operation): string {
  const condition = operation.condition
    ? `if ${conditionText(circuit, operation.condition)}: `
    : '';
  const wire = (w: number): string => wireName(circuit, w);
  switch (operation.kind) {
    case 'gate': {
      const { name, angles, wires, controls, power, label } = operation;
      const modifiers = controls.map((c) => (c ? 'ctrl ' : 'negctrl ')).join('');
      const powers = power === 1 ? '' : `pow ${power} `;
      const list = angles.length > 0 ? `(${angles.map((x) => +x.toFixed(6)).join(',')})` : '';
      return `${condition}${modifiers}${powers}${label ?? name}${list} ${wires.map(wire).join(' ')}`;
    }
    case 'measure':
      return operation.bit < 0
        ? `${condition}measure ${wire(operation.wire)}`
        : `${condition}${bitName(circuit, operation.bit)} = measure ${wire(operation.wire)}`;
    case 'reset':
      return `${condition}reset ${wire(operation.wire)}`;
    case 'barrier':
      return `barrier ${operation.wires.map(wire).join(' ')}`;
    case 'assign':
      return `${condition}${bitName(circuit, operation.bit)} = ${conditionText(circuit, operation.value)}`;
  }
}

const saying = (circuit: Circuit): string[] => circuit.operations.map((o) => say(circuit, o));

describe('gates and registers', () => {
  test.each([
    ['qubit[2] q; h q[0]; cx q[0], q[1];', ['h q[0]', 'cx q[0] q[1]']],
    ['qubit a; qubit b; cx a, b;', ['cx a b']],
    ['qreg q[2]; cx q[1], q[0];', ['cx q[1] q[0]']],
    ['qubit[3] q; h q;', ['h q[0]', 'h q[1]', 'h q[2]']],
    ['qubit[2] a; qubit[2] b; cx a, b;', ['cx a[0] b[0]', 'cx a[1] b[1]']],
    ['qubit a; qubit[2] b; cx a, b;', ['cx a b[0]', 'cx a b[1]']],
    ['qubit[5] q; h q[0:3];', ['h q[0]', 'h q[1]', 'h q[2]', 'h q[3]']],
    ['qubit[7] q; h q[0:2:6];', ['h q[0]', 'h q[2]', 'h q[4]', 'h q[6]']],
    ['qubit[5] q; h q[3:-1:1];', ['h q[3]', 'h q[2]', 'h q[1]']],
    ['qubit[5] q; h q[-1]; h q[-2:-1];', ['h q[4]', 'h q[3]', 'h q[4]']],
    ['qubit[5] q; h q[:1]; x q[3:];', ['h q[0]', 'h q[1]', 'x q[3]', 'x q[4]']],
    ['qubit[6] q; h q[{0, 2, 5}];', ['h q[0]', 'h q[2]', 'h q[5]']],
    ['qubit[6] q; h q[1:4][2];', ['h q[3]']],
    ['qubit[4] q; let a = q[1:2]; h a; x a[0];', ['h q[1]', 'h q[2]', 'x q[1]']],
    ['qubit[2] a; qubit b; let c = b ++ a[{1}]; cx c[0], c[1];', ['cx b a[1]']],
    ['const int n = 3; qubit[n] q; x q[n - 1];', ['x q[2]']],
    [
      'qubit[4] q; for int i in [0:2] { cx q[i], q[i + 1]; }',
      ['cx q[0] q[1]', 'cx q[1] q[2]', 'cx q[2] q[3]'],
    ],
    ['qubit[4] q; for uint i in {3, 1} x q[i];', ['x q[3]', 'x q[1]']],
    ['qubit[4] q; for int[32] i in [2:-2:0] x q[i];', ['x q[2]', 'x q[0]']],
    [
      'qubit[3] q; for int i in [0:1] { for int j in [0:i] { const int k = i + j; x q[k]; } }',
      ['x q[0]', 'x q[1]', 'x q[2]'],
    ],
    [
      'qubit[3] q; barrier; barrier q[1]; barrier q[0:1], q[2];',
      ['barrier q[0] q[1] q[2]', 'barrier q[1]', 'barrier q[0] q[1] q[2]'],
    ],
    ['qubit[2] Θ; h Θ[1];', ['h Θ[1]']],
    [
      'qubit q; U(1, 2, 3) q; u3(1, 2, 3) q; phase(0.5) q;',
      ['U(1,2,3) q', 'u3(1,2,3) q', 'phase(0.5) q'],
    ],
    ['qubit[2] q; /* a\n comment */ h q[0]; // another\n h q[1];', ['h q[0]', 'h q[1]']],
  ])('%s', (body, expected) => {
    expect(saying(read(body))).toEqual(expected);
  });

  test('registers keep their names, sizes and order', () => {
    const circuit = read('qubit[2] gauge; bit flag; qubit weir; bit[3] out;');
    expect(circuit.qubitRegisters).toEqual([
      { name: 'gauge', first: 0, size: 2, scalar: false },
      { name: 'weir', first: 2, size: 1, scalar: true },
    ]);
    expect(circuit.bitRegisters.map(({ first, size }) => [first, size])).toEqual([
      [0, 1],
      [1, 3],
    ]);
    expect(circuit).toMatchObject({ wires: 3, bits: 4, language: '3', name: 'test.qasm' });
  });

  test('every operation knows its line and column', () => {
    const places = read('qubit q;\n  h q; x q;\nfor int i in [0:1] {\n  z q;\n}').operations;
    expect(places.map(({ line, column }) => [line, column])).toEqual([
      [4, 3],
      [4, 8],
      [6, 3],
      [6, 3],
    ]);
  });

  test('Windows line ends, tabs and a byte order mark are nothing', () => {
    const text = `\uFEFF${HEAD}qubit q;\n\th q;\n`.replaceAll('\n', '\r\n');
    const { circuit } = readCircuit(text, 'w.qasm');
    expect(saying(circuit)).toEqual(['h q']);
    expect(circuit.operations[0]).toMatchObject({ line: 4, column: 2 });
  });
});

describe('angles', () => {
  const angle = (expression: string, head = HEAD): number => {
    const isOld = head === HEAD_2;
    const text = `${head}${isOld ? 'qreg q[1]; rx' : 'qubit[1] q; rx'}(${expression}) q[0];`;
    return (readCircuit(text, 'a.qasm').circuit.operations[0] as GateOperation).angles[0]!;
  };
  const pi = Math.PI;
  test.each([
    ['pi', pi],
    ['π/2', pi / 2],
    ['tau', 2 * pi],
    ['τ / 4', pi / 2],
    ['euler', Math.E],
    ['ℇ', Math.E],
    ['-pi/4', -pi / 4],
    ['pi * 1/2', pi / 2],
    ['3*pi/8', (3 * pi) / 8],
    ['1.5e-3 + .5', 0.5015],
    ['2 ** 3 ** 2', 512],
    ['-2 ** 2', -4],
    ['2 ** -1', 0.5],
    ['7 % 4', 3],
    ['mod(7, 4)', 3],
    ['pow(2, 10)', 1024],
    ['sin(pi/6)', Math.sin(pi / 6)],
    ['arccos(0) + arcsin(1) + arctan(1)', 1.25 * pi],
    ['sqrt(2) * log(exp(1))', Math.SQRT2],
    ['floor(2.7) + ceiling(2.1)', 5],
    ['1_000', 1000],
    ['0b101 + 0x1F + 0o17', 5 + 31 + 15],
    ['(1 + 2) * (3 - 4)', -3],
    ['1 << 4', 16],
    ['6 & 3 | 8 ^ 1', (6 & 3) | (8 ^ 1)],
    ['float(3) / 2', 1.5],
    ['int(2.9)', 2],
    ['-0', 0],
    ['2 - 3 - 4', -5],
    ['8 / 2 / 2', 2],
  ])('%s', (expression, value) => {
    expect(angle(expression)).toBe(value);
  });

  test.each([
    ['pi/2', pi / 2],
    ['1/2*pi', pi / 2],
    ['2^3^2', 512],
    ['-2^2', -4],
    ['ln(2) + sin(0) + sqrt(4)', Math.LN2 + 2],
    ['3/2', 1.5],
  ])('2.0: %s', (expression, value) => {
    expect(angle(expression, HEAD_2)).toBe(value);
  });

  test('the division of integers truncates in 3 and is warned of where that loses something', () => {
    expect(angle('1/2 * pi')).toBe(0);
    expect(angle('-7/2')).toBe(-3);
    const text = `${HEAD}qubit q;\nrx(1/2 * pi) q; rx(4/2) q;`;
    expect(warningsOf(text)).toEqual([
      '4:5 1 / 2 divides integers and gives 0; write 1.0 / 2 for a fraction',
    ]);
  });

  test('constants are typed', () => {
    const circuit = read(
      'const float x = pi / 4; const int n = 7; const bool b = n > 5; qubit q; rx(n / 2 * x * b) q;',
    );
    expect((circuit.operations[0] as GateOperation).angles[0]).toBe(3 * (pi / 4));
  });
});

describe('modifiers', () => {
  test.each([
    ['ctrl @ x q[0], q[1];', ['cx q[0] q[1]']],
    ['ctrl(2) @ x q[0], q[1], q[2];', ['ccx q[0] q[1] q[2]']],
    ['ctrl @ ctrl @ x q[0], q[1], q[2];', ['ccx q[0] q[1] q[2]']],
    ['negctrl @ x q[0], q[1];', ['negctrl x q[0] q[1]']],
    ['negctrl @ ctrl @ z q[0], q[1], q[2];', ['negctrl cz q[0] q[1] q[2]']],
    ['ctrl @ negctrl @ z q[0], q[1], q[2];', ['ctrl negctrl z q[0] q[1] q[2]']],
    ['negctrl(2) @ y q[2], q[1], q[0];', ['negctrl negctrl y q[2] q[1] q[0]']],
    ['inv @ s q[0]; inv @ t q[0]; inv @ rx(0.3) q[0];', ['sdg q[0]', 'tdg q[0]', 'rx(-0.3) q[0]']],
    ['inv @ U(1, 2, 3) q[0];', ['U(-1,-3,-2) q[0]']],
    [
      'pow(2) @ s q[0]; pow(-1) @ s q[0]; pow(-3) @ s q[0];',
      ['pow 2 s q[0]', 'sdg q[0]', 'pow -3 s q[0]'],
    ],
    ['pow(0) @ x q[0]; pow(1) @ x q[0];', ['x q[0]']],
    [
      'pow(0.5) @ x q[0]; ctrl @ pow(0.5) @ x q[0], q[1];',
      ['pow 0.5 x q[0]', 'ctrl pow 0.5 x q[0] q[1]'],
    ],
    ['inv @ pow(0.5) @ x q[0];', ['pow -0.5 x q[0]']],
    ['pow(0.5) @ inv @ s q[0];', ['pow 0.5 sdg q[0]']],
    ['ctrl @ gphase(0.25) q[1];', ['p(0.25) q[1]']],
    ['ctrl(2) @ gphase(0.25) q[1], q[2];', ['cp(0.25) q[2] q[1]']],
    ['ctrl @ swap q[0], q[1], q[2];', ['cswap q[0] q[1] q[2]']],
    ['ctrl @ h q[0], q[1:2];', ['ch q[0] q[1]', 'ch q[0] q[2]']],
  ])('%s', (body, expected) => {
    const sentences = saying(read(`qubit[3] q; ${body}`));
    // cp is symmetric: its operands may stand in either order
    const order = (s: string): string => (s.startsWith('cp') ? s.split(' ').sort().join(' ') : s);
    expect(sentences.map(order)).toEqual(expected.map(order));
  });

  const unitary = (body: string): Float64Array => circuitUnitary(read(body));
  const difference = (a: Float64Array, b: Float64Array): number =>
    a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);
  const equal = (a: Float64Array, b: Float64Array): void => {
    expect(difference(a, b)).toBeLessThan(1e-13);
  };
  /** |0><0| x 1 + |1><1| x u, spelt out. */
  const controlledBy = (u: Float64Array, d: number): Float64Array => {
    const out = new Float64Array(8 * d * d);
    for (let i = 0; i < d; i++) {
      out[i * 2 * d + i] = 1;
      for (let j = 0; j < d; j++) {
        out[(d + i) * 2 * d + d + j] = u[i * d + j]!;
        out[4 * d * d + (d + i) * 2 * d + d + j] = u[d * d + i * d + j]!;
      }
    }
    return out;
  };

  const GATE =
    'gate drift(a) w, v { gphase(a / 3); h w; rz(a) v; cx w, v; U(a, 0.2, 0.3) w; sx v; } ';

  test('the factor e^{it/2} of U shows under ctrl', () => {
    const plain = unitary('qubit q; U(0.7, 0.2, -1.1) q;');
    equal(unitary('qubit[2] q; ctrl @ U(0.7, 0.2, -1.1) q[0], q[1];'), controlledBy(plain, 2));
    const [re, im] = [plain[0]!, plain[4]!];
    expect(Math.atan2(im, re)).toBeCloseTo(0.35, 14);
  });

  test('a phase in a gate body becomes a phase on the control', () => {
    const plain = unitary(`${GATE}qubit[2] q; drift(0.9) q[0], q[1];`);
    const control = unitary(`${GATE}qubit[3] q; ctrl @ drift(0.9) q[0], q[1], q[2];`);
    equal(control, controlledBy(plain, 4));
    const negative = unitary(
      `${GATE}qubit[3] q; x q[0]; negctrl @ drift(0.9) q[0], q[1], q[2]; x q[0];`,
    );
    equal(negative, control);
    const both = unitary(
      `${GATE}qubit[4] q; x q[1]; ctrl @ negctrl @ drift(0.9) q[0], q[1], q[2], q[3]; x q[1];`,
    );
    equal(both, controlledBy(control, 8));
  });

  test('inverse and integer powers of a defined gate', () => {
    const u = unitary(`${GATE}qubit[2] q; drift(0.9) q[0], q[1];`);
    const inverse = unitary(`${GATE}qubit[2] q; inv @ drift(0.9) q[0], q[1];`);
    const d = 4;
    const product = mul(inverse, u, d);
    equal(product, unitary('qubit[2] q;'));
    equal(unitary(`${GATE}qubit[2] q; pow(3) @ drift(0.9) q[0], q[1];`), mul(u, mul(u, u, d), d));
    equal(unitary(`${GATE}qubit[2] q; pow(-2) @ drift(0.9) q[0], q[1];`), mul(inverse, inverse, d));
  });

  test('fractional powers are principal powers of the exact matrix', () => {
    const u = unitary(`${GATE}qubit[2] q; drift(0.9) q[0], q[1];`);
    const root = unitary(`${GATE}qubit[2] q; pow(1/3.0) @ drift(0.9) q[0], q[1];`);
    equal(mul(root, mul(root, root, 4), 4), u);
    equal(root, unitaryPower(u, 4, 1 / 3));
    const control = unitary(`${GATE}qubit[3] q; ctrl @ pow(1/3.0) @ drift(0.9) q[0], q[1], q[2];`);
    equal(control, controlledBy(root, 4));
    equal(unitary(`${GATE}qubit[3] q; pow(1/3.0) @ ctrl @ drift(0.9) q[0], q[1], q[2];`), control);
    equal(unitary('qubit q; pow(0.5) @ x q;'), gateTable.get('sx')!.matrix([]));
  });

  test('pow(1/2) is the square root, as the library of the standard writes it', () => {
    equal(unitary('qubit q; pow(1/2) @ x q;'), gateTable.get('sx')!.matrix([]));
    const text = `${HEAD}qubit q; pow(1/2) @ x q; rx(3/2) q;`;
    const [root, turn] = readCircuit(text, 'p').circuit.operations as GateOperation[];
    expect([root?.power, turn?.angles]).toEqual([0.5, [1]]);
    expect(warningsOf(text)).toHaveLength(1);
  });

  test('the order of modifiers counts: the nearest to the gate first', () => {
    // the inverse of x is x, whose principal root is sx; the inverse of the root is another matrix
    equal(unitary('qubit q; pow(0.5) @ inv @ x q;'), gateTable.get('sx')!.matrix([]));
    equal(unitary('qubit q; inv @ pow(0.5) @ x q;'), gateTable.get('sxdg')!.matrix([]));
    // a square wraps round before its root is taken
    const wrapped = unitary('qubit q; pow(0.5) @ pow(2) @ rz(5) q;');
    equal(
      wrapped,
      unitaryPower(
        mul(...([gateTable.get('rz')!.matrix([5]), gateTable.get('rz')!.matrix([5]), 2] as const)),
        2,
        0.5,
      ),
    );
  });

  test('a top-level gphase is the global phase', () => {
    expect(read('qubit q; gphase(pi / 3); inv @ gphase(0.1);').globalPhase).toBeCloseTo(
      Math.PI / 3 - 0.1,
      15,
    );
    expect(read('qubit q; pow(0.5) @ gphase(3 * pi);').globalPhase).toBeCloseTo(Math.PI / 2, 14);
  });

  test('a fractional power remembers how its gate is made', () => {
    const [operation] = read(`${GATE}qubit[2] q; pow(0.5) @ drift(0.9) q[1], q[0];`).operations;
    const gate = operation as GateOperation;
    expect(gate).toMatchObject({ name: 'unitary', label: 'drift', power: 0.5, wires: [1, 0] });
    expect(gate.definition?.operations.length).toBe(5);
    expect(gate.definition?.phase).toBeCloseTo(0.3, 15);
    expect(gateMatrix(gate).length).toBe(32);
  });
});

describe('gate definitions', () => {
  test.each([
    ['gate bell a, b { h a; cx a, b; } qubit[2] q; bell q[1], q[0];', ['h q[1]', 'cx q[1] q[0]']],
    [
      'gate turn(t, s) a { rx(t / 2) a; rz(-s) a; } qubit q; turn(1, 2) q;',
      ['rx(0.5) q', 'rz(-2) q'],
    ],
    ['const float k = 0.5; gate g a { rx(k) a; } qubit q; g q;', ['rx(0.5) q']],
    [
      'gate g a, b { for int i in [1:2] { rx(i * pi) a; cx a, b; } } qubit[2] q; g q[0], q[1];',
      ['rx(3.141593) q[0]', 'cx q[0] q[1]', 'rx(6.283185) q[0]', 'cx q[0] q[1]'],
    ],
    ['gate g a { } qubit q; g q;', []],
    ['gate g() a { x a; } qubit q; g q; g() q;', ['x q', 'x q']],
    [
      'gate g a, b { barrier a, b; h a; } qubit[2] q; g q[0], q[1];',
      ['barrier q[0] q[1]', 'h q[0]'],
    ],
    ['gate f a { x a; } gate g a { f a; inv @ f a; } qubit q; g q;', ['x q', 'x q']],
    [
      'gate rzz(t) a, b { cx a, b; rz(t) b; cx a, b; } qubit[2] q; rzz(0.3) q[0], q[1];',
      ['rzz(0.3) q[0] q[1]'],
    ],
    [
      'gate rzz(t) a, b { cx a, b; p(t) b; cx a, b; } qubit[2] q; rzz(0.3) q[0], q[1];',
      ['cx q[0] q[1]', 'p(0.3) q[1]', 'cx q[0] q[1]'],
    ],
    [
      'gate rzz(t) a, b { cx a, b; rz(sin(t)) b; cx a, b; } qubit[2] q; rzz(0) q[0], q[1];',
      ['cx q[0] q[1]', 'rz(0) q[1]', 'cx q[0] q[1]'],
    ],
  ])('%s', (body, expected) => {
    expect(saying(read(body))).toEqual(expected);
  });

  test('a body does not see what surrounds the call', () => {
    const circuit = read('const int i = 7; gate g a { rx(i) a; } qubit q; for int i in [1:1] g q;');
    expect(saying(circuit)).toEqual(['rx(7) q']);
  });
});

describe('measurement, reset and bits', () => {
  test.each([
    ['c[0] = measure q[0];', ['c[0] = measure q[0]']],
    ['measure q[1] -> c[1];', ['c[1] = measure q[1]']],
    ['c = measure q;', ['c[0] = measure q[0]', 'c[1] = measure q[1]']],
    ['measure q -> c;', ['c[0] = measure q[0]', 'c[1] = measure q[1]']],
    ['measure q;', ['measure q[0]', 'measure q[1]']],
    ['bit d = measure q[0];', ['d = measure q[0]']],
    ['bit[2] d = measure q;', ['d[0] = measure q[0]', 'd[1] = measure q[1]']],
    ['c[1:-1:0] = measure q;', ['c[1] = measure q[0]', 'c[0] = measure q[1]']],
    ['reset q; reset q[1];', ['reset q[0]', 'reset q[1]', 'reset q[1]']],
    ['bit d = 1; bit[3] e = "011"; bit f = 0;', ['d = true', 'e[0] = true', 'e[1] = true']],
    [
      'c = "10"; c[0] = c[1]; c[1] = !c[0];',
      ['c[0] = false', 'c[1] = true', 'c[0] = c[1]', 'c[1] = !c[0]'],
    ],
    ['c = 2; c ^= "11";', ['c[0] = false', 'c[1] = true', 'c[0] = !c[0]', 'c[1] = !c[1]']],
    [
      'c[0] ^= c[1]; c[0] |= c[1]; c[0] &= c[1];',
      ['c[0] = c[0] ^ c[1]', 'c[0] = c[0] || c[1]', 'c[0] = c == 3'],
    ],
    ['c = c[1:-1:0];', ['held_0 = c[1]', 'held_1 = c[0]', 'c[0] = held_0', 'c[1] = held_1']],
  ])('%s', (body, expected) => {
    expect(saying(read(`qubit[2] q; bit[2] c; ${body}`))).toEqual(expected);
  });

  test('2.0', () => {
    const circuit = read2(
      'qreg q[2]; creg c[2]; h q; measure q -> c; if(c==2) x q[0]; reset q[1];',
    );
    expect(saying(circuit)).toEqual([
      'h q[0]',
      'h q[1]',
      'c[0] = measure q[0]',
      'c[1] = measure q[1]',
      'if c == 2: x q[0]',
      'reset q[1]',
    ]);
    expect(circuit.language).toBe('2.0');
  });
});

describe('conditions', () => {
  test.each([
    ['c[0]', 'c[0]'],
    ['!c[0]', '!c[0]'],
    ['c[0] == 1', 'c[0]'],
    ['c[0] == 0', '!c[0]'],
    ['c[0] != 1', '!c[0]'],
    ['1 == c[0]', 'c[0]'],
    ['c[0] == true', 'c[0]'],
    ['c[0] == false', '!c[0]'],
    ['d', 'd'],
    ['c == 5', 'c == 5'],
    ['c != 5', 'c != 5'],
    ['"101" == c', 'c == 5'],
    ['int(c) == 5', 'c == 5'],
    ['c[0:1] == 2', '!c[0] && c[1]'],
    ['c', 'c[0] || c[1] || c[2]'],
    ['c < 1', 'c == 0'],
    ['c[0] && !c[1] || d', '(c[0] && !c[1]) || d'],
    ['c[0] ^ c[1]', 'c[0] ^ c[1]'],
    ['c[0] ^ c[1] ^ 1', '!(c[0] ^ c[1])'],
    ['c[0] & c[1] | d', '(c[0] && c[1]) || d'],
    ['~c[0]', '!c[0]'],
    ['c[0] == c[1]', '!(c[0] ^ c[1])'],
    ['(c[0]) == (true)', 'c[0]'],
  ])('%s', (condition, expected) => {
    const circuit = read(`qubit q; bit[3] c; bit d; if (${condition}) x q;`);
    expect(saying(circuit)).toEqual([`if ${expected}: x q`]);
  });

  /** Which values of a 3-bit register let the gate happen. */
  const holds = (condition: string): number[] => {
    const [operation] = read(`qubit q; bit[3] c; bit[3] e; if (${condition}) x q;`).operations;
    return [0, 1, 2, 3, 4, 5, 6, 7].filter((value) =>
      evaluate(
        operation?.condition ?? { kind: 'constant', value: false },
        (bit) => ((value >> bit) & 1) === 1,
      ),
    );
  };
  const evaluate = (
    e: NonNullable<Operation['condition']>,
    bit: (b: number) => boolean,
  ): boolean => {
    if (e.kind === 'constant') return e.value;
    if (e.kind === 'bit') return bit(e.bit);
    if (e.kind === 'not') return !evaluate(e.of, bit);
    const parts = e.of.map((part) => evaluate(part, bit));
    if (e.kind === 'and') return parts.every(Boolean);
    return e.kind === 'or' ? parts.some(Boolean) : parts.filter(Boolean).length % 2 === 1;
  };

  test.each([
    ['c < 5', [0, 1, 2, 3, 4]],
    ['c <= 5', [0, 1, 2, 3, 4, 5]],
    ['c > 5', [6, 7]],
    ['c >= 6', [6, 7]],
    ['6 > c', [0, 1, 2, 3, 4, 5]],
    ['c < 3 && c != 1', [0, 2]],
    ['c == e', [0]],
    ['c > e', [1, 2, 3, 4, 5, 6, 7]],
    ['c <= e', [0]],
    ['(c & 6) == 4', [4, 5]],
    ['(c | 1) == 5', [4, 5]],
    ['(c ^ 7) < 2', [6, 7]],
    ['~c == 0', [7]],
  ])('%s holds for %j', (condition, values) => {
    expect(holds(condition)).toEqual(values);
  });

  test('else, else if, and blocks', () => {
    const circuit = read(`qubit[2] q; bit[2] c;
      if (c[0]) { x q[0]; y q[1]; } else if (c[1]) z q[0]; else { h q[0]; }`);
    expect(saying(circuit)).toEqual([
      'if c[0]: x q[0]',
      'if c[0]: y q[1]',
      'if c == 2: z q[0]',
      'if c == 0: h q[0]',
    ]);
  });

  test('a condition keeps its value while its own bits are written', () => {
    const circuit = read('qubit[2] q; bit c; if (c) { c = measure q[0]; x q[1]; } else y q[1];');
    expect(saying(circuit)).toEqual([
      'held_0 = c',
      'if held_0: c = measure q[0]',
      'if held_0: x q[1]',
      'if !held_0: y q[1]',
    ]);
    expect(saying(read('qubit q; bit c; if (c) { c = measure q; }'))).toEqual([
      'if c: c = measure q',
    ]);
  });

  test('the bit that keeps a condition is hidden: no output of the program', () => {
    const circuit = read('qubit[2] q; bit c; if (c) { c = measure q[0]; x q[1]; }');
    expect(circuit.bitRegisters[1]).toMatchObject({ name: 'held_0', hidden: true });
    expect(visibleBits(circuit)).toEqual([0]);
    const declared = read('qubit q;\n@wiregauge.hidden\nbit[2] kept; bit c;');
    expect(visibleBits(declared)).toEqual([2]);
  });

  test('constant conditions choose at once; a comparison that cannot hold is warned of', () => {
    expect(saying(read('qubit q; if (1 < 2) x q; else y q;'))).toEqual(['x q']);
    expect(warningsOf(`${HEAD}qubit q; bit[2] c;\nif (c == 4) x q;`)).toEqual([
      '4:7 the comparison with 4 is always false: the register has 2 bits',
    ]);
  });

  test('a phase under a condition on bits is never seen', () => {
    expect(read('qubit q; bit c; if (c) { gphase(1); }').globalPhase).toBe(0);
    expect(read('qubit q; if (true) { gphase(1); }').globalPhase).toBe(1);
  });
});

describe('annotations, pragmas, versions', () => {
  test('annotations belong to the next statement and stack', () => {
    const circuit = read(`qubit[2] q; bit c;
@wiregauge.enters 3
@valley.note  river  
reset q[0];
if (c) {
  @wiregauge.leaves 1
  c = measure q[1];
}
h q[0];`);
    expect(circuit.operations.map(({ annotations }) => annotations)).toEqual([
      ['wiregauge.enters 3', 'valley.note  river'],
      ['wiregauge.leaves 1'],
      undefined,
    ]);
  });

  test('pragmas are passed over with a warning, a missing version is told', () => {
    expect(warningsOf('pragma gauge depth 3\n#pragma other\nqubit q;')).toEqual([
      '1:1 no version line: read as OpenQASM 3',
      '1:1 pragma ignored: gauge depth 3',
      '2:1 pragma ignored: other',
    ]);
  });

  test.each(['3', '3.0', '3.1'])('version %s', (version) => {
    expect(readCircuit(`OPENQASM ${version};\nqubit q;`, 'v.qasm').circuit.language).toBe('3');
  });

  test('the paper and later copies of the 2.0 header mean two gates by cu3: a warning', () => {
    const text = `${HEAD_2}qreg q[2];\ncu3(1,2,3) q[0],q[1]; cu3(1,2,3) q[0],q[1];`;
    expect(warningsOf(text)).toHaveLength(1);
  });

  test('the 2.0 header has its later gates; a definition in the text replaces them', () => {
    expect(read2('qreg q[4]; rc3x q[0],q[1],q[2],q[3]; u0(1) q[0];').operations.length).toBe(19);
    const own = read2('gate u0(g) a { x a; } qreg q[1]; u0(1) q[0];');
    expect(saying(own)).toEqual(['x q[0]']);
  });
});
