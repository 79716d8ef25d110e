/**
 * Every gate of both standard headers through the reader and the check, against matrices that NumPy computes from the formulas of the
 * standards: as written in a text, under `ctrl`, `negctrl`, `inv` and `pow`, and with its phase, which a control makes visible.
 *
 * OpenQASM 3: the bodies of stdgates.inc from U, gphase, ctrl and pow. OpenQASM 2.0: the bodies of its header from U = Rz Ry Rz and
 * CX (Cross, Bishop, Smolin, Gambetta, arXiv:1707.03429); there the phase is free, and a text has no controls to show it.
 */
import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { type Circuit, circuitOfUnitary } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { python, pythonTest } from '../support/python.ts';

/** Name, angles, wires: everything that stdgates.inc defines, and the built-in U. */
const GATES_3 = `p 1 1, x 0 1, y 0 1, z 0 1, h 0 1, s 0 1, sdg 0 1, t 0 1, tdg 0 1, sx 0 1, rx 1 1, ry 1 1, rz 1 1, cx 0 2, cy 0 2, cz 0 2,
  cp 1 2, crx 1 2, cry 1 2, crz 1 2, ch 0 2, swap 0 2, ccx 0 3, cswap 0 3, cu 4 2, CX 0 2, phase 1 1, cphase 1 2, id 0 1, u1 1 1,
  u2 2 1, u3 3 1, U 3 1`;
/** The header of the paper, and what later copies of it add. */
const GATES_2 = `u3 3 1, u2 2 1, u1 1 1, cx 0 2, id 0 1, x 0 1, y 0 1, z 0 1, h 0 1, s 0 1, sdg 0 1, t 0 1, tdg 0 1, rx 1 1, ry 1 1, rz 1 1,
  cz 0 2, cy 0 2, ch 0 2, ccx 0 3, crz 1 2, cu1 1 2, cu3 3 2, U 3 1, CX 0 2, u 3 1, p 1 1, sx 0 1, sxdg 0 1, swap 0 2, cswap 0 3,
  crx 1 2, cry 1 2, cp 1 2, csx 0 2, cu 4 2, rxx 1 2, rzz 1 2, rccx 0 3, c3x 0 4, c3sqrtx 0 4, c4x 0 5`;

type Gate = { name: string; angles: number; wires: number };
const listOf = (text: string): Gate[] =>
  text.split(',').map((part) => {
    const [name, angles, wires] = part.trim().split(' ');
    return { name: name!, angles: Number(angles), wires: Number(wires) };
  });

type Modifier = 'ctrl' | 'negctrl' | 'inv' | number;
/** A call: modifiers outermost first, a number being an exponent. */
type Call = {
  dialect: '2.0' | '3';
  name: string;
  angles: number[];
  wires: number;
  modifiers: Modifier[];
};

const MODIFIERS: readonly Modifier[][] = [
  [],
  ['ctrl'],
  ['negctrl'],
  ['inv'],
  [2],
  [-1],
  [0.5],
  ['ctrl', 'inv'],
  ['ctrl', 0.25],
  ['inv', 'ctrl', 3],
  ['negctrl', 'ctrl'],
];

function anglesOf({ name, angles }: Gate, round: number): number[] {
  const draw = random(33, name, round);
  return Array.from({ length: angles }, () => Math.round(9000 * (draw() - 0.5)) / 1000);
}

const callsOf = (dialect: '2.0' | '3', gates: Gate[], modifiers: readonly Modifier[][]): Call[] =>
  gates.flatMap((gate) =>
    modifiers.flatMap((list) =>
      Array.from({ length: gate.angles > 0 ? 2 : 1 }, (_, round): Call => {
        const angles = anglesOf(gate, round);
        return { dialect, name: gate.name, angles, wires: gate.wires, modifiers: list };
      }),
    ),
  );

const controlsOf = ({ modifiers }: Call): number =>
  modifiers.filter((m) => m === 'ctrl' || m === 'negctrl').length;

function textOf(call: Call): string {
  const { dialect, name, angles, wires, modifiers } = call;
  const n = wires + controlsOf(call);
  const before = modifiers
    .map((m) => (typeof m === 'number' ? `pow(${m}) @ ` : `${m} @ `))
    .join('');
  const list = angles.length > 0 ? `(${angles.join(', ')})` : '';
  const operands = Array.from({ length: n }, (_, k) => `q[${k}]`).join(', ');
  const head =
    dialect === '3'
      ? `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[${n}] q;`
      : `OPENQASM 2.0;\ninclude "qelib1.inc";\nqreg q[${n}];`;
  return `${head}\n${before}${name}${list} ${operands};\n`;
}

const FORMULAS = `
import sys, json
import numpy as np
pi = np.pi
e = lambda a: np.exp(1j * a)
def ctrl(u, on=1):
    d = len(u); v = np.eye(2 * d, dtype=complex)
    if on: v[d:, d:] = u
    else: v[:d, :d] = u
    return v
def power(u, k):
    if k == int(k): return np.linalg.matrix_power(u if k >= 0 else u.conj().T, abs(int(k)))
    w, v = np.linalg.eigh((u + u.conj().T) / 2 + 0.7320508076 * (u - u.conj().T) / 2j)
    phases = np.angle(np.diag(v.conj().T @ u @ v))
    phases = np.where(phases <= -pi + 1e-9, pi, phases)
    return v @ np.diag(e(k * phases)) @ v.conj().T
def on(n, u, *wires):
    k = len(wires)
    t = np.eye(2 ** n, dtype=complex).reshape([2] * (2 * n))
    t = np.tensordot(u.reshape([2] * (2 * k)), t, axes=(list(range(k, 2 * k)), wires))
    return np.moveaxis(t, range(k), wires).reshape(2 ** n, 2 ** n)
def circuit(n, *steps):
    u = np.eye(2 ** n, dtype=complex)
    for m, *wires in steps: u = on(n, m, *wires) @ u
    return u
# OpenQASM 3: the built-in gates, then stdgates.inc in its own order
def U(t, f, l):
    return 0.5 * np.array([[1 + e(t), -1j * e(l) * (1 - e(t))], [1j * e(f) * (1 - e(t)), e(f + l) * (1 + e(t))]])
p = lambda l: ctrl(np.array([[e(l)]]))
x = U(pi, 0, pi) * e(-pi / 2); y = U(pi, pi / 2, pi / 2) * e(-pi / 2); z = p(pi); h = U(pi / 2, 0, pi) * e(-pi / 4)
s = power(z, 0.5); t = power(s, 0.5); sx = power(x, 0.5)
rx = lambda a: U(a, -pi / 2, pi / 2) * e(-a / 2)
ry = lambda a: U(a, 0, 0) * e(-a / 2)
rz = lambda a: U(0, 0, a) * e(-a / 2)
cx = ctrl(x); swap = circuit(2, (cx, 0, 1), (cx, 1, 0), (cx, 0, 1))
cu = lambda a, f, l, g: circuit(2, (p(g - a / 2), 0), (ctrl(U(a, f, l)), 0, 1))
G3 = {'p': p, 'x': x, 'y': y, 'z': z, 'h': h, 's': s, 'sdg': s.conj().T, 't': t, 'tdg': t.conj().T, 'sx': sx, 'rx': rx, 'ry': ry, 'rz': rz,
 'cx': cx, 'cy': ctrl(y), 'cz': ctrl(z), 'cp': lambda l: ctrl(p(l)), 'crx': lambda a: ctrl(rx(a)), 'cry': lambda a: ctrl(ry(a)),
 'crz': lambda a: ctrl(rz(a)), 'ch': ctrl(h), 'swap': swap, 'ccx': ctrl(ctrl(x)), 'cswap': ctrl(swap), 'cu': cu, 'CX': cx, 'phase': p,
 'cphase': lambda l: ctrl(p(l)), 'id': U(0, 0, 0), 'u1': p, 'u2': lambda f, l: e(-(f + l + pi / 2) / 2) * U(pi / 2, f, l),
 'u3': lambda a, f, l: e(-(f + l + a) / 2) * U(a, f, l), 'U': U}
# OpenQASM 2.0: U = Rz Ry Rz and CX, then the header; what later copies add, by circuits of these
Rz = lambda a: np.diag([e(-a / 2), e(a / 2)])
Ry = lambda a: np.array([[np.cos(a / 2), -np.sin(a / 2)], [np.sin(a / 2), np.cos(a / 2)]], dtype=complex)
V = lambda a, f, l: Rz(f) @ Ry(a) @ Rz(l)
CX = np.eye(4, dtype=complex)[[0, 1, 3, 2]]
w1 = lambda l: V(0, 0, l); H = V(pi / 2, 0, pi); T = w1(pi / 4); Td = w1(-pi / 4); S = w1(pi / 2); Sd = w1(-pi / 2); XX = V(pi, 0, pi)
ccx2 = circuit(3, (H, 2), (CX, 1, 2), (Td, 2), (CX, 0, 2), (T, 2), (CX, 1, 2), (Td, 2), (CX, 0, 2), (T, 1), (T, 2), (H, 2), (CX, 0, 1), (T, 0), (Td, 1), (CX, 0, 1))
cu1 = lambda l: circuit(2, (w1(l / 2), 0), (CX, 0, 1), (w1(-l / 2), 1), (CX, 0, 1), (w1(l / 2), 1))
cu3 = lambda a, f, l: circuit(2, (w1((l - f) / 2), 1), (CX, 0, 1), (V(-a / 2, 0, -(f + l) / 2), 1), (CX, 0, 1), (V(a / 2, f, 0), 1))
crz = lambda a: circuit(2, (w1(a / 2), 1), (CX, 0, 1), (w1(-a / 2), 1), (CX, 0, 1))
ch2 = circuit(2, (H, 1), (Sd, 1), (CX, 0, 1), (H, 1), (T, 1), (CX, 0, 1), (T, 1), (H, 1), (S, 1), (XX, 1), (S, 0))
rccx = circuit(3, (H, 2), (T, 2), (CX, 1, 2), (Td, 2), (CX, 0, 2), (T, 2), (CX, 1, 2), (Td, 2), (H, 2))
pp = lambda P: (lambda a: np.cos(a / 2) * np.eye(4) - 1j * np.sin(a / 2) * np.kron(P, P))
G2 = {'u3': V, 'u2': lambda f, l: V(pi / 2, f, l), 'u1': w1, 'cx': CX, 'id': V(0, 0, 0), 'x': XX, 'y': V(pi, pi / 2, pi / 2), 'z': w1(pi), 'h': H,
 's': S, 'sdg': Sd, 't': T, 'tdg': Td, 'rx': lambda a: V(a, -pi / 2, pi / 2), 'ry': lambda a: V(a, 0, 0), 'rz': w1,
 'cz': circuit(2, (H, 1), (CX, 0, 1), (H, 1)), 'cy': circuit(2, (Sd, 1), (CX, 0, 1), (S, 1)), 'ch': ch2, 'ccx': ccx2, 'crz': crz, 'cu1': cu1,
 'cu3': cu3, 'U': V, 'CX': CX, 'u': V, 'p': w1, 'sx': sx, 'sxdg': sx.conj().T, 'swap': circuit(2, (CX, 0, 1), (CX, 1, 0), (CX, 0, 1)),
 'cswap': circuit(3, (CX, 2, 1), (ccx2, 0, 1, 2), (CX, 2, 1)), 'crx': lambda a: cu3(a, -pi / 2, pi / 2), 'cry': lambda a: cu3(a, 0, 0), 'cp': cu1,
 'csx': circuit(2, (H, 1), (cu1(pi / 2), 0, 1), (H, 1)), 'cu': cu, 'rxx': pp(np.array([[0, 1], [1, 0]])), 'rzz': pp(np.diag([1, -1])),
 'rccx': rccx, 'c3x': ctrl(ctrl(CX)), 'c3sqrtx': ctrl(ctrl(ctrl(sx))), 'c4x': ctrl(ctrl(ctrl(CX)))}
out = []
for c in json.load(sys.stdin):
    g = (G3 if c['dialect'] == '3' else G2)[c['name']]
    u = g(*c['angles']) if callable(g) else g
    for m in reversed(c['modifiers']):
        if m == 'ctrl': u = ctrl(u)
        elif m == 'negctrl': u = ctrl(u, 0)
        elif m == 'inv': u = u.conj().T
        else: u = power(u, m)
    out.append([float(v) for v in np.concatenate([u.real.ravel(), u.imag.ravel()])])
print(json.dumps(out))
`;

const difference = (a: Float64Array, b: Float64Array): number =>
  a.length === b.length
    ? a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0)
    : Number.POSITIVE_INFINITY;

function answersOf(calls: readonly Call[]): Float64Array[] {
  const answers = python(FORMULAS, calls) as number[][];
  expect(answers.length).toBe(calls.length);
  return answers.map((list) => Float64Array.from(list));
}

const read = (text: string): Circuit => readCircuit(text, 'standard.qasm').circuit;

describe('the gates of the standard headers, from their texts', () => {
  const calls3 = callsOf('3', listOf(GATES_3), MODIFIERS);
  const calls2 = callsOf('2.0', listOf(GATES_2), [[]]);

  pythonTest(
    'OpenQASM 3: 33 gates, plain and under ten lists of modifiers, phases included (seed 33)',
    () => {
      const answers = answersOf(calls3);
      calls3.forEach((call, k) => {
        const text = textOf(call);
        const circuit = read(text);
        const isWrong = !(difference(circuitUnitary(circuit), answers[k]!) < 1e-12);
        const n = call.wires + controlsOf(call);
        const report = compareCircuits(circuitOfUnitary(answers[k]!, n, 'formula'), circuit);
        const { verdict, phase } = report;
        // the check sees no phase between the two either
        const isTurned = Math.abs(phase ?? 1) > 1e-12;
        expect({ text, isWrong, verdict, isTurned }).toEqual({ text, isWrong: false, verdict: 'same', isTurned: false }); // biome-ignore format: one check
      });
    },
  );

  pythonTest(
    'OpenQASM 2.0: 42 gates of its header and of later copies, up to the phase (seed 33)',
    () => {
      const answers = answersOf(calls2);
      calls2.forEach((call, k) => {
        const text = textOf(call);
        const report = compareCircuits(
          circuitOfUnitary(answers[k]!, call.wires, 'formula'),
          read(text),
        );
        const { verdict, distance } = report;
        expect({ text, verdict, isFar: distance!.hilbertSchmidt > 1e-28 }).toEqual({ text, verdict: 'same', isFar: false }); // biome-ignore format: one check
      });
    },
  );

  test('all gates of both headers are there', () => {
    expect(listOf(GATES_3)).toHaveLength(33);
    expect(listOf(GATES_2)).toHaveLength(42);
    const others = [...calls3, ...calls2].filter(
      (call) => read(textOf(call)).operations.length !== 1,
    );
    // powers and inverses of some are several operations or none
    expect(others.every(({ modifiers }) => modifiers.length > 0)).toBe(true);
  });

  test('a control makes a phase visible: U and u3, gphase, rz and p', () => {
    const same = (a: string, b: string) =>
      compareCircuits(read(`OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[2] q;\n${a}`), read(`OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[2] q;\n${b}`)).verdict; // biome-ignore format: one call
    for (const [a, b] of [
      ['U(0.5, 0.2, 0.9) q[1];', 'u3(0.5, 0.2, 0.9) q[1];'],
      ['rz(0.7) q[1];', 'p(0.7) q[1];'],
      ['gphase(0.3);', ''],
    ] as const) {
      const controlled = (text: string): string =>
        text === '' ? '' : text.startsWith('gphase') ? 'ctrl @ gphase(0.3) q[0];' : `ctrl @ ${text.replace('q[1]', 'q[0], q[1]')}`; // biome-ignore format: one choice
      expect(same(a, b)).toBe('same');
      expect(same(controlled(a), controlled(b))).toBe('different');
    }
    expect(same('ctrl @ gphase(0.3) q[0];', 'p(0.3) q[0];')).toBe('same');
  });
});
