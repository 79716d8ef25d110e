import { describe, expect, test } from 'vitest';
import { type Circuit, emptyCircuit, gate } from '../../src/circuit/circuit.ts';
import { type GateEntry, gateTable, PAULI } from '../../src/circuit/gates.ts';
import { circuitUnitary, gateMatrix } from '../../src/circuit/unitary.ts';
import { adjoint, identity, kron, mul, unitarityError } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { python, pythonTest } from '../support/python.ts';

const ENTRIES = [...gateTable.values()];
const ROUNDS = 3;

/** Angles of either sign, up to a few turns. */
function anglesOf(entry: GateEntry, round: number): number[] {
  const draw = random(20, entry.name, round);
  return Array.from({ length: entry.angles }, () => 20 * (draw() - 0.5));
}

const difference = (a: Float64Array, b: Float64Array): number =>
  a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);

/** A Pauli word such as `IZX` as a matrix. */
function word(letters: string): Float64Array {
  let out = identity(1);
  let d = 1;
  for (const letter of letters) {
    out = kron(out, PAULI[letter as keyof typeof PAULI], d, 2);
    d *= 2;
  }
  return out;
}

describe.each(ENTRIES)('$name', (entry) => {
  const n = entry.wires;
  const d = 2 ** n;
  const rounds = Array.from({ length: ROUNDS }, (_, k) => anglesOf(entry, k));

  test('is unitary, and its inverse is the inverse', () => {
    for (const angles of rounds) {
      const u = entry.matrix(angles);
      expect(u.length).toBe(2 * d * d);
      expect(unitarityError(u, d)).toBeLessThan(1e-14);
      const inverse = entry.inverse(angles);
      const v = gateTable.get(inverse.name)?.matrix(inverse.angles);
      expect(v && difference(mul(v, u, d), identity(d))).toBeLessThan(1e-14);
    }
  });

  test('diagonal, monomial and self-inverse are told truly', () => {
    const all = rounds.map((angles) => entry.matrix(angles));
    const offDiagonal = (u: Float64Array): boolean =>
      u.some((x, k) => Math.abs(x) > 1e-15 && Math.floor((k % (d * d)) / d) !== k % d);
    const entriesInRow = (u: Float64Array, i: number): number => {
      let count = 0;
      for (let j = 0; j < d; j++) {
        if (Math.hypot(u[i * d + j]!, u[d * d + i * d + j]!) > 1e-15) count++;
      }
      return count;
    };
    const isMonomial = (u: Float64Array): boolean =>
      Array.from({ length: d }, (_, i) => entriesInRow(u, i)).every((count) => count === 1);
    expect(entry.diagonal).toBe(!all.some(offDiagonal));
    expect(entry.monomial).toBe(all.every(isMonomial));
    const isInvolution = all.every((u) => difference(mul(u, u, d), identity(d)) < 1e-14);
    expect(entry.selfInverse).toBe(isInvolution);
  });

  test('maps Paulis to Paulis exactly when it says so', () => {
    let maps = entry.angles === 0;
    for (let wire = 0; maps && wire < n; wire++) {
      for (const letter of ['X', 'Z']) {
        const pauli = word('I'.repeat(wire) + letter + 'I'.repeat(n - wire - 1));
        const u = entry.matrix([]);
        const image = mul(mul(u, pauli, d), adjoint(u, d), d);
        // a Pauli word has entries of size 0 or 1 only, one in each row, and squares to 1
        maps &&= image.every((x) => Math.min(Math.abs(x), Math.abs(Math.abs(x) - 1)) < 1e-12);
        maps &&= isPauliWord(image, n);
      }
    }
    expect(entry.clifford).toBe(maps);
  });

  test('commutes with Z exactly on the operands it calls controls', () => {
    for (let wire = 0; wire < n; wire++) {
      const z = word(`${'I'.repeat(wire)}Z${'I'.repeat(n - wire - 1)}`);
      const commutes = rounds.every((angles) => {
        const u = entry.matrix(angles);
        return difference(mul(u, z, d), mul(z, u, d)) < 1e-14;
      });
      expect({ wire, commutes }).toEqual({ wire, commutes: entry.controlOperands.includes(wire) });
    }
  });

  if (!entry.generator) return;

  test('generators are the derivatives', () => {
    const step = 1e-5;
    for (const angles of rounds) {
      const generators = entry.generator?.(angles) ?? [];
      expect(generators.length).toBe(entry.angles);
      generators.forEach((g, k) => {
        const shifted = (by: number): Float64Array =>
          entry.matrix(angles.map((x, j) => (j === k ? x + by : x)));
        const [plus, minus] = [shifted(step), shifted(-step)];
        const slope = plus.map((x, i) => (x - minus[i]!) / (2 * step));
        const gu = mul(g, entry.matrix(angles), d);
        // -i (re + i im) = im - i re
        const claimed = gu.map((_, i) => (i < d * d ? gu[d * d + i]! : -gu[i - d * d]!));
        expect(difference(slope, claimed)).toBeLessThan(1e-9);
      });
    }
  });
});

function isPauliWord(matrix: Float64Array, n: number): boolean {
  const d = 2 ** n;
  for (let code = 0; code < 4 ** n; code++) {
    let letters = '';
    for (let k = 0; k < n; k++) letters += 'IXYZ'[Math.floor(code / 4 ** k) % 4];
    const pauli = word(letters);
    if (difference(matrix, pauli) < 1e-12) return true;
    if (
      difference(
        matrix,
        pauli.map((x) => -x),
      ) < 1e-12
    )
      return true;
  }
  return d === 0;
}

// Every matrix once more, from the formulas of the standard's text: the built-in U, gphase, ctrl, inv and pow of
// OpenQASM 3 with the bodies of stdgates.inc; the circuits of the 2.0 header (arXiv:1707.03429 and later
// copies); exponentials of Paulis by eigenvalues for the rest. `up_to_phase` where 2.0 leaves the phase free.
const FORMULAS = `
import sys, json
import numpy as np
pi = np.pi
I2 = np.eye(2, dtype=complex)
X = np.array([[0, 1], [1, 0]], dtype=complex)
Y = np.array([[0, -1j], [1j, 0]])
Z = np.diag([1, -1]).astype(complex)
def expi(a): return np.exp(1j * a)
def U(t, f, l):
    return 0.5 * np.array([[1 + expi(t), -1j * expi(l) * (1 - expi(t))],
                           [1j * expi(f) * (1 - expi(t)), expi(f + l) * (1 + expi(t))]])
def gphase(g): return expi(g)
def ctrl(u, n=1):
    for _ in range(n):
        d = len(u)
        v = np.eye(2 * d, dtype=complex)
        v[d:, d:] = u
        u = v
    return u
def power(u, k):
    w, v = np.linalg.eig(u)   # all arguments here have distinct eigenvalues
    return v @ np.diag(np.exp(1j * k * np.angle(w))) @ np.linalg.inv(v)
def expm(h):  # exp(i h), h Hermitian
    w, v = np.linalg.eigh(h)
    return v @ np.diag(np.exp(1j * w)) @ v.conj().T
def on(n, u, *wires):
    out = np.zeros((2 ** n, 2 ** n), dtype=complex)
    k = len(wires)
    for column in range(2 ** n):
        bits = [(column >> (n - 1 - w)) & 1 for w in range(n)]
        sub = int(''.join(str(bits[w]) for w in wires), 2)
        for row in range(2 ** k):
            new = list(bits)
            for j, w in enumerate(wires): new[w] = (row >> (k - 1 - j)) & 1
            out[int(''.join(map(str, new)), 2), column] += u[row, sub]
    return out
def circuit(n, *steps):
    u = np.eye(2 ** n, dtype=complex)
    for m, *wires in steps: u = on(n, m, *wires) @ u
    return u
# stdgates.inc
def p(l): return ctrl(np.array([[gphase(l)]]))
x = U(pi, 0, pi) * gphase(-pi / 2)
y = U(pi, pi / 2, pi / 2) * gphase(-pi / 2)
z = p(pi)
h = U(pi / 2, 0, pi) * gphase(-pi / 4)
s = power(z, 0.5); sdg = s.conj().T
t = power(s, 0.5); tdg = t.conj().T
sx = power(x, 0.5); sxdg = sx.conj().T
def rx(a): return U(a, -pi / 2, pi / 2) * gphase(-a / 2)
def ry(a): return U(a, 0, 0) * gphase(-a / 2)
def rz(a): return gphase(-a / 2) * U(0, 0, a)
def u2(f, l): return gphase(-(f + l + pi / 2) / 2) * U(pi / 2, f, l)
def u3(a, f, l): return gphase(-(f + l + a) / 2) * U(a, f, l)
cx = ctrl(x)
swap = circuit(2, (cx, 0, 1), (cx, 1, 0), (cx, 0, 1))
def cu(a, f, l, g): return circuit(2, (p(g - a / 2), 0), (ctrl(U(a, f, l)), 0, 1))
# 2.0: U(t,f,l) = Rz(f) Ry(t) Rz(l) by plain matrices
def Ry2(a): return np.array([[np.cos(a/2), -np.sin(a/2)], [np.sin(a/2), np.cos(a/2)]], dtype=complex)
def Rz2(a): return np.diag([np.exp(-1j*a/2), np.exp(1j*a/2)])
def U2(a, f, l): return Rz2(f) @ Ry2(a) @ Rz2(l)
def u1_2(l): return U2(0, 0, l)
h2 = U2(pi/2, 0, pi)
CX = np.array([[1,0,0,0],[0,1,0,0],[0,0,0,1],[0,0,1,0]], dtype=complex)
def cu3_2(a, f, l):
    return circuit(2, (u1_2((l - f) / 2), 1), (CX, 0, 1), (U2(-a / 2, 0, -(f + l) / 2), 1), (CX, 0, 1), (U2(a / 2, f, 0), 1))
def rccx_2():
    return circuit(3, (U2(pi/2, 0, pi), 2), (u1_2(pi/4), 2), (CX, 1, 2), (u1_2(-pi/4), 2), (CX, 0, 2),
                   (u1_2(pi/4), 2), (CX, 1, 2), (u1_2(-pi/4), 2), (U2(pi/2, 0, pi), 2))
XX, YY, ZZ, ZX = np.kron(X, X), np.kron(Y, Y), np.kron(Z, Z), np.kron(Z, X)
G = {
 'id': lambda: U(0, 0, 0), 'x': lambda: x, 'y': lambda: y, 'z': lambda: z, 'h': lambda: h,
 's': lambda: s, 'sdg': lambda: sdg, 't': lambda: t, 'tdg': lambda: tdg, 'sx': lambda: sx, 'sxdg': lambda: sxdg,
 'rx': rx, 'ry': ry, 'rz': rz, 'p': p, 'u1': p, 'phase': p, 'u2': u2, 'u3': u3,
 'u': lambda a, f, l: U(a, f, l) * gphase(-a / 2), 'U': U,
 'prx': lambda a, f: expm(-a / 2 * (np.cos(f) * X + np.sin(f) * Y)),
 'cx': lambda: cx, 'CX': lambda: cx, 'cy': lambda: ctrl(y), 'cz': lambda: ctrl(z), 'ch': lambda: ctrl(h),
 'csx': lambda: ctrl(sx), 'csxdg': lambda: ctrl(sxdg), 'swap': lambda: swap,
 'iswap': lambda: expm(pi / 4 * (XX + YY)), 'iswapdg': lambda: expm(-pi / 4 * (XX + YY)),
 'sqrtiswap': lambda: expm(pi / 8 * (XX + YY)), 'sqrtiswapdg': lambda: expm(-pi / 8 * (XX + YY)),
 'ecr': lambda: np.kron(X, I2) @ expm(-pi / 4 * ZX),
 'b': lambda: expm(pi / 4 * XX + pi / 8 * YY), 'bdg': lambda: expm(-pi / 4 * XX - pi / 8 * YY),
 'cp': lambda l: ctrl(p(l)), 'cphase': lambda l: ctrl(p(l)), 'cu1': lambda l: ctrl(p(l)),
 'crx': lambda a: ctrl(rx(a)), 'cry': lambda a: ctrl(ry(a)), 'crz': lambda a: ctrl(rz(a)), 'cu': cu, 'cu3': cu3_2,
 'rxx': lambda a: expm(-a / 2 * XX), 'ryy': lambda a: expm(-a / 2 * YY), 'rzz': lambda a: expm(-a / 2 * ZZ),
 'ccx': lambda: ctrl(x, 2), 'ccz': lambda: ctrl(z, 2), 'cswap': lambda: ctrl(swap), 'rccx': rccx_2,
 'c3x': lambda: ctrl(x, 3), 'c4x': lambda: ctrl(x, 4), 'c3sqrtx': lambda: ctrl(sx, 3), 'c3sqrtxdg': lambda: ctrl(sxdg, 3),
}
free = ['cu3', 'rccx']
jobs = json.load(sys.stdin)
out = []
for name, angles in jobs:
    m = G[name](*angles)
    out.append([name in free] + [float(v) for v in np.concatenate([m.real.ravel(), m.imag.ravel()])])
print(json.dumps(out))
`;

pythonTest('every gate equals what NumPy computes from the formulas of the standard', () => {
  const jobs = ENTRIES.flatMap((entry) =>
    Array.from({ length: ROUNDS }, (_, k) => [entry.name, anglesOf(entry, k)] as const),
  );
  const answers = python(FORMULAS, jobs) as [boolean, ...number[]][];
  expect(answers.length).toBe(jobs.length);
  jobs.forEach(([name, angles], k) => {
    const [isFree, ...numbers] = answers[k]!;
    const expected = Float64Array.from(numbers);
    const actual = gateTable.get(name)!.matrix(angles);
    const error = isFree
      ? Math.sqrt(hilbertSchmidtDistance(actual, expected).distance)
      : difference(actual, expected);
    expect({ name, isWrong: error > 1e-13 }).toEqual({ name, isWrong: false });
  });
});

describe('published identities', () => {
  const unitary = (n: number, ...steps: [string, number[], ...number[]][]): Float64Array => {
    const operations = steps.map(([name, wires, ...angles]) => gate(name, wires, ...angles));
    const circuit: Circuit = { ...emptyCircuit(n), operations };
    return circuitUnitary(circuit);
  };
  const named = (n: number, name: string, ...angles: number[]): Float64Array =>
    unitary(n, [name, Array.from({ length: n }, (_, k) => k), ...angles]);
  const same = (a: Float64Array, b: Float64Array): void => {
    expect(hilbertSchmidtDistance(a, b).distance).toBeLessThan(1e-28);
  };

  test('Toffoli from six CX (Nielsen, Chuang, Quantum Computation, figure 4.9)', () => {
    same(
      unitary(
        3,
        ['h', [2]], ['cx', [1, 2]], ['tdg', [2]], ['cx', [0, 2]], ['t', [2]], ['cx', [1, 2]], ['tdg', [2]],
        ['cx', [0, 2]], ['t', [1]], ['t', [2]], ['h', [2]], ['cx', [0, 1]], ['t', [0]], ['tdg', [1]], ['cx', [0, 1]],
      ), // biome-ignore format: a circuit in the order of the figure
      named(3, 'ccx'),
    );
  });

  test('Toffoli from five two-wire gates (Barenco et al., PRA 52, 3457 (1995), lemma 6.1)', () => {
    same(
      unitary(
        3,
        ['csx', [1, 2]],
        ['cx', [0, 1]],
        ['csxdg', [1, 2]],
        ['cx', [0, 1]],
        ['csx', [0, 2]],
      ),
      named(3, 'ccx'),
    );
  });

  test('SWAP from three CX, and Fredkin from CX, Toffoli, CX', () => {
    same(unitary(2, ['cx', [0, 1]], ['cx', [1, 0]], ['cx', [0, 1]]), named(2, 'swap'));
    same(unitary(3, ['cx', [2, 1]], ['ccx', [0, 1, 2]], ['cx', [2, 1]]), named(3, 'cswap'));
  });

  test('a CX turned round by H on both wires; CZ is symmetric', () => {
    const turned = unitary(2, ['h', [0]], ['h', [1]], ['cx', [0, 1]], ['h', [0]], ['h', [1]]);
    same(turned, unitary(2, ['cx', [1, 0]]));
    same(unitary(2, ['cz', [0, 1]]), unitary(2, ['cz', [1, 0]]));
  });

  test('two square roots of iSWAP make one, two iSWAP make ZZ', () => {
    same(unitary(2, ['sqrtiswap', [0, 1]], ['sqrtiswap', [0, 1]]), named(2, 'iswap'));
    same(unitary(2, ['iswap', [0, 1]], ['iswap', [0, 1]]), unitary(2, ['z', [0]], ['z', [1]]));
  });

  test('the relative-phase Toffoli is a Toffoli up to phases', () => {
    const product = mul(named(3, 'rccx'), named(3, 'ccx'), 8);
    for (let i = 0; i < 8; i++) {
      expect(Math.hypot(product[i * 8 + i]!, product[64 + i * 8 + i]!)).toBeCloseTo(1, 14);
    }
  });

  test('a controlled power is the power of the controlled gate', () => {
    for (const power of [0.5, -0.25, 1 / 3, 3]) {
      const plain = { ...gate('cx', [0, 1]), power };
      const control = { ...gate('x', [0, 1]), power, controls: [true] };
      expect(difference(gateMatrix(plain), gateMatrix(control))).toBeLessThan(1e-14);
    }
  });
});
