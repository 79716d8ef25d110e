/**
 * Random OpenQASM 3 texts of gates, definitions and modifiers against matrices that NumPy builds from the
 * standard's rules alone: U by its formula, ctrl and negctrl as block matrices, inv as the adjoint, pow as the
 * principal power of the matrix, each applied to the whole gate from the innermost modifier outwards.
 */
import { expect } from 'vitest';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { python, pythonTest } from '../support/python.ts';

type Modifier = ['ctrl' | 'negctrl'] | ['inv'] | ['pow', number];
/** A call: its modifiers (outermost first), a gate, angles, and wires (controls first). */
type Call = { modifiers: Modifier[]; gate: string; angles: number[]; wires: number[] };
type Definition = { name: string; wires: number; body: Call[] };
type Program = { wires: number; definitions: Definition[]; calls: Call[] };

const BASE: [string, number, number][] = [
  ['U', 3, 1],
  ['gphase', 1, 0],
  ['x', 0, 1],
  ['h', 0, 1],
  ['s', 0, 1],
  ['t', 0, 1],
  ['sx', 0, 1],
  ['rx', 1, 1],
  ['ry', 1, 1],
  ['rz', 1, 1],
  ['p', 1, 1],
  ['u2', 2, 1],
  ['u3', 3, 1],
  ['cx', 0, 2],
  ['cz', 0, 2],
  ['crz', 1, 2],
  ['cp', 1, 2],
  ['swap', 0, 2],
  ['cu', 4, 2],
];

function randomProgram(draw: Random): Program {
  const pick = <T>(list: readonly T[]): T => list[Math.floor(draw() * list.length)]!;
  const wires = 4;
  const definitions: Definition[] = [];
  const call = (room: number): Call => {
    for (;;) {
      const own = definitions.map(({ name, wires: n }): [string, number, number] => [name, 0, n]);
      const [gate, angles, count] = pick(own.length > 0 && draw() < 0.4 ? own : BASE);
      const modifiers: Modifier[] = [];
      while (draw() < 0.45 && modifiers.length < 3) {
        const kind = pick(['ctrl', 'negctrl', 'inv', 'pow'] as const);
        // exponents keep away from where a phase of exactly pi is cut by rounding
        if (kind === 'pow') modifiers.push(['pow', pick([0.5, -0.3, 2, -1, 3, 0.25, 0])]);
        else modifiers.push([kind]);
      }
      const total = count + modifiers.filter(([kind]) => /ctrl$/.test(kind)).length;
      if (total > room) continue;
      const order = Array.from({ length: room }, (_, k) => k).sort(() => draw() - 0.5);
      const list = Array.from({ length: angles }, () => Math.round(6000 * (draw() - 0.5)) / 1000);
      return { modifiers, gate, angles: list, wires: order.slice(0, total) };
    }
  };
  for (const name of ['weir', 'sluice']) {
    const n = 1 + Math.floor(draw() * 3);
    const body = Array.from({ length: 3 }, () => call(n));
    definitions.push({ name, wires: n, body });
  }
  return { wires, definitions, calls: Array.from({ length: 4 }, () => call(wires)) };
}

function textOf({ wires, definitions, calls }: Program): string {
  const sayCall = (call: Call, wire: (k: number) => string): string => {
    const modifiers = call.modifiers.map(([kind, k]) =>
      kind === 'pow' ? `pow(${k}) @ ` : `${kind} @ `,
    );
    const list = call.angles.length > 0 ? `(${call.angles.join(', ')})` : '';
    return `${modifiers.join('')}${call.gate}${list} ${call.wires.map(wire).join(', ')};`;
  };
  const defined = definitions.map(({ name, wires: n, body }) => {
    const operands = Array.from({ length: n }, (_, k) => `w${k}`).join(', ');
    return `gate ${name} ${operands} { ${body.map((c) => sayCall(c, (k) => `w${k}`)).join(' ')} }`;
  });
  return [
    'OPENQASM 3.0;',
    'include "stdgates.inc";',
    ...defined,
    `qubit[${wires}] q;`,
    ...calls.map((c) => sayCall(c, (k) => `q[${k}]`)),
  ].join('\n');
}

const RULES = `
import sys, json
import numpy as np
pi = np.pi
e = lambda a: np.exp(1j * a)
def U(t, f, l):
    return 0.5 * np.array([[1 + e(t), -1j * e(l) * (1 - e(t))], [1j * e(f) * (1 - e(t)), e(f + l) * (1 + e(t))]])
def ctrl(u):
    d = len(u); v = np.eye(2 * d, dtype=complex); v[d:, d:] = u; return v
def negctrl(u):
    d = len(u); v = np.eye(2 * d, dtype=complex); v[:d, :d] = u; return v
def power(u, k):
    # powers through the Hermitian and anti-Hermitian parts of a normal matrix, safe for equal eigenvalues
    w, v = np.linalg.eigh((u + u.conj().T) / 2 + 0.6180339887 * (u - u.conj().T) / 2j)
    phases = np.angle(np.diag(v.conj().T @ u @ v))
    phases = np.where(phases <= -pi + 1e-9, pi, phases)
    return v @ np.diag(np.exp(1j * k * phases)) @ v.conj().T
def on(n, u, wires):
    k = len(wires)
    t = np.eye(2 ** n, dtype=complex).reshape([2] * (2 * n))
    t = np.tensordot(u.reshape([2] * (2 * k)), t, axes=(list(range(k, 2 * k)), wires))
    return np.moveaxis(t, range(k), wires).reshape(2 ** n, 2 ** n)
X = np.array([[0, 1], [1, 0]], dtype=complex)
rot = lambda P, a: np.cos(a / 2) * np.eye(2) - 1j * np.sin(a / 2) * P
Y = np.array([[0, -1j], [1j, 0]]); Z = np.diag([1, -1]).astype(complex)
p = lambda a: np.diag([1, e(a)])
G = {'U': U, 'gphase': lambda a: np.array([[e(a)]]), 'x': lambda: X, 'h': lambda: (X + Z) / np.sqrt(2),
     's': lambda: p(pi / 2), 't': lambda: p(pi / 4), 'sx': lambda: power(X, 0.5), 'rx': lambda a: rot(X, a),
     'ry': lambda a: rot(Y, a), 'rz': lambda a: rot(Z, a), 'p': p,
     'u2': lambda f, l: e(-(f + l + pi / 2) / 2) * U(pi / 2, f, l), 'u3': lambda t, f, l: e(-(f + l + t) / 2) * U(t, f, l),
     'cx': lambda: ctrl(X), 'cz': lambda: ctrl(Z), 'crz': lambda a: ctrl(rot(Z, a)), 'cp': lambda a: ctrl(p(a)),
     'swap': lambda: np.eye(4, dtype=complex)[[0, 2, 1, 3]],
     'cu': lambda t, f, l, g: np.kron(p(g - t / 2), np.eye(2)) @ ctrl(U(t, f, l))}
def call(c, known):
    u = known[c['gate']] if c['gate'] in known else G[c['gate']](*c['angles'])
    for m in reversed(c['modifiers']):
        if m[0] == 'ctrl': u = ctrl(u)
        elif m[0] == 'negctrl': u = negctrl(u)
        elif m[0] == 'inv': u = u.conj().T
        elif m[1] == int(m[1]): u = np.linalg.matrix_power(u if m[1] >= 0 else u.conj().T, abs(int(m[1])))
        else: u = power(u, m[1])
    return u
def apply(n, calls, known):
    u = np.eye(2 ** n, dtype=complex)
    for c in calls:
        v = call(c, known)
        u = (v[0, 0] * u) if len(c['wires']) == 0 else on(n, v, c['wires']) @ u
    return u
out = []
for program in json.load(sys.stdin):
    known = {}
    for d in program['definitions']: known[d['name']] = apply(d['wires'], d['body'], known)
    u = apply(program['wires'], program['calls'], known)
    out.append([float(x) for x in np.concatenate([u.real.ravel(), u.imag.ravel()])])
print(json.dumps(out))
`;

pythonTest(
  '300 random texts mean what NumPy makes of them by the rules of the standard (seed 71)',
  () => {
    const draw = random(71);
    const programs = Array.from({ length: 300 }, () => randomProgram(draw));
    const answers = python(RULES, programs) as number[][];
    programs.forEach((program, k) => {
      const text = textOf(program);
      const actual = circuitUnitary(readCircuit(text, 'random.qasm').circuit);
      const worst = actual.reduce((most, x, i) => Math.max(most, Math.abs(x - answers[k]![i]!)), 0);
      expect({ text, isWrong: !(worst < 1e-12) }).toEqual({ text, isWrong: false });
    });
  },
);
