/**
 * Random programs with measurements, resets, assignments, loops and nested if / else against a branch simulation
 * in NumPy that runs the statements as they stand: a condition is decided once, when its `if` is reached. The
 * reader flattens the same text; its circuit must give the same distribution of bits.
 */
import { expect } from 'vitest';
import { bitDistribution } from '../../src/device/density.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';
import { python, pythonTest } from '../support/python.ts';

const WIRES = 3;
const BITS = 3;

type Condition =
  | ['bit', number]
  | ['not', Condition]
  | ['and' | 'or' | 'xor', Condition, Condition]
  | ['compare', '==' | '!=' | '<' | '>=', number];
type Statement =
  | ['gate', string, number[], number | null]
  | ['measure', number, number]
  | ['measureAll']
  | ['reset', number]
  | ['assign', number, Condition]
  | ['if', Condition, Statement[], Statement[]]
  | ['for', number, Statement[]];

function randomBlock(draw: Random, depth: number, length: number): Statement[] {
  const below = (n: number): number => Math.floor(draw() * n);
  const condition = (level: number): Condition => {
    const kind = below(level > 0 ? 6 : 2);
    if (kind === 0) return ['bit', below(BITS)];
    if (kind === 1) return ['compare', (['==', '!=', '<', '>='] as const)[below(4)]!, 1 + below(6)];
    if (kind === 2) return ['not', condition(level - 1)];
    return [(['and', 'or', 'xor'] as const)[kind - 3]!, condition(level - 1), condition(level - 1)];
  };
  return Array.from({ length }, (): Statement => {
    const kind = below(depth > 0 ? 12 : 9);
    const wire = below(WIRES);
    const other = (wire + 1 + below(WIRES - 1)) % WIRES;
    if (kind < 2) return ['gate', 'ry', [wire], Math.round(600 * draw()) / 100];
    if (kind < 3) return ['gate', 'x', [wire], null];
    if (kind < 5) return ['gate', 'cx', [wire, other], null];
    if (kind < 7) return draw() < 0.15 ? ['measureAll'] : ['measure', wire, below(BITS)];
    if (kind < 8) return ['reset', wire];
    if (kind < 9) return ['assign', below(BITS), condition(1)];
    if (kind < 10) return ['for', 1 + below(2), randomBlock(draw, depth - 1, 2)];
    const otherwise = draw() < 0.5 ? randomBlock(draw, depth - 1, 1 + below(2)) : [];
    return ['if', condition(2), randomBlock(draw, depth - 1, 1 + below(3)), otherwise];
  });
}

function sayCondition(c: Condition): string {
  if (c[0] === 'bit') return `c[${c[1]}]`;
  if (c[0] === 'not') return `!(${sayCondition(c[1])})`;
  if (c[0] === 'compare') return `(c ${c[1]} ${c[2]})`;
  const operator = { and: '&&', or: '||', xor: '^' }[c[0]];
  return `((${sayCondition(c[1])}) ${operator} (${sayCondition(c[2])}))`;
}

function say(s: Statement): string {
  switch (s[0]) {
    case 'gate':
      return `${s[1]}${s[3] === null ? '' : `(${s[3]})`} ${s[2].map((w) => `q[${w}]`).join(', ')};`;
    case 'measure':
      return `c[${s[2]}] = measure q[${s[1]}];`;
    case 'measureAll':
      return 'c = measure q;';
    case 'reset':
      return `reset q[${s[1]}];`;
    case 'assign':
      return `c[${s[1]}] = ${sayCondition(s[2])};`;
    case 'for':
      return `for int k in [1:${s[1]}] { ${s[2].map(say).join(' ')} }`;
    case 'if': {
      const otherwise = s[3].length > 0 ? ` else { ${s[3].map(say).join('\n')} }` : '';
      return `if (${sayCondition(s[1])}) { ${s[2].map(say).join('\n')} }${otherwise}`;
    }
  }
}

const BRANCHES = `
import sys, json
import numpy as np
N, B, programs = json.load(sys.stdin)
def on(state, u, wires):
    k = len(wires)
    t = np.tensordot(u.reshape([2] * (2 * k)), state.reshape([2] * N), axes=(list(range(k, 2 * k)), wires))
    return np.moveaxis(t, range(k), wires).ravel()
X = np.array([[0, 1], [1, 0]]); CX = np.eye(4)[[0, 1, 3, 2]]
P = [np.diag([1, 0]), np.diag([0, 1])]
def holds(c, bits):
    if c[0] == 'bit': return bool(bits[c[1]])
    if c[0] == 'not': return not holds(c[1], bits)
    if c[0] == 'compare':
        v = sum(b << k for k, b in enumerate(bits)); n = c[2]
        return {'==': v == n, '!=': v != n, '<': v < n, '>=': v >= n}[c[1]]
    a, b = holds(c[1], bits), holds(c[2], bits)
    return {'and': a and b, 'or': a or b, 'xor': a != b}[c[0]]
def run(statements, branches):
    for s in statements: branches = [out for b in branches for out in step(s, b)]
    return branches
def step(s, branch):
    state, bits = branch
    if s[0] == 'gate':
        u = {'x': X, 'cx': CX}.get(s[1])
        if u is None:
            h = s[3] / 2; u = np.array([[np.cos(h), -np.sin(h)], [np.sin(h), np.cos(h)]])
        return [(on(state, u, s[2]), bits)]
    if s[0] == 'measureAll':
        return run([['measure', k, k] for k in range(N)], [branch])
    if s[0] == 'measure' or s[0] == 'reset':
        out = []
        for v in (0, 1):
            new = on(state, P[v], [s[1]])
            if np.vdot(new, new).real < 1e-14: continue
            b = list(bits)
            if s[0] == 'measure': b[s[2]] = v
            elif v: new = on(new, X, [s[1]])
            out.append((new, tuple(b)))
        return out
    if s[0] == 'assign':
        b = list(bits); b[s[1]] = int(holds(s[2], bits)); return [(state, tuple(b))]
    if s[0] == 'for':
        out = [branch]
        for _ in range(s[1]): out = run(s[2], out)
        return out
    return run(s[2] if holds(s[1], bits) else s[3], [branch])
out = []
for program in programs:
    start = np.zeros(2 ** N, dtype=complex); start[0] = 1
    total = {}
    for state, bits in run(program, [(start, (0,) * B)]):
        key = ''.join(map(str, bits)); total[key] = total.get(key, 0) + np.vdot(state, state).real
    out.append(total)
print(json.dumps(out))
`;

pythonTest(
  '200 random programs give the bits of an independent branch simulation (seed 91)',
  () => {
    const draw = random(91);
    const programs = Array.from({ length: 200 }, () => randomBlock(draw, 3, 9));
    const answers = python(BRANCHES, [WIRES, BITS, programs]) as { [bits: string]: number }[];
    let held = 0;
    programs.forEach((program, k) => {
      const body = program.map(say).join('\n');
      const text = `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[${WIRES}] q;\nbit[${BITS}] c;\n${body}\n`;
      const { circuit } = readCircuit(text, 'program.qasm');
      if (circuit.bits > BITS) held++;
      const again = readCircuit(writeCircuit(circuit), 'again.qasm').circuit;
      for (const version of [circuit, again]) {
        const found = new Map<string, number>();
        for (const [bits, p] of bitDistribution(version)) {
          // hidden bits come after the program's own
          const key = bits.slice(0, BITS);
          found.set(key, (found.get(key) ?? 0) + p);
        }
        const keys = new Set([...found.keys(), ...Object.keys(answers[k]!)]);
        const worst = Math.max(
          ...[...keys].map((key) => Math.abs((found.get(key) ?? 0) - (answers[k]![key] ?? 0))),
        );
        expect({ text, isWrong: !(worst < 1e-11) }).toEqual({ text, isWrong: false });
      }
    });
    // the case of a condition that changes under its own body occurs
    expect(held).toBeGreaterThan(20);
  },
);
