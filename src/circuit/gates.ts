/**
 * The gate table: every gate a circuit may name, with its matrix, its generator and what is known of it.
 *
 * Shape: matrices are planar (real parts, then imaginary parts), row-major, 2^k x 2^k; the first operand is
 * the most significant bit.
 * Convention: OpenQASM 3 (stdgates.inc) phases throughout, because a phase becomes visible under `ctrl @`;
 * the names of the 2.0 header that 3 does not define follow their 2.0 meaning up to phase, which is free
 * there. `generator`: dU/d angle_k = -i G_k(angles) U with a Hermitian G_k; a gate whose only angle is a
 * rotation has G = P/2 constant.
 * Source: OpenQASM 3 language and standard library (ACM Trans. Quantum Comput. 3, 12 (2022)); 2.0 header
 * (Cross, Bishop, Smolin, Gambetta, arXiv:1707.03429); others named at their rows.
 */
import { fromRows, identity, kron } from '../numeric/complex-matrix.ts';

export type GateEntry = {
  name: string;
  /** Number of wires. */
  wires: number;
  /** Number of angles. */
  angles: number;
  matrix(angles: readonly number[]): Float64Array;
  /** Diagonal in the computational basis for all angles. */
  diagonal: boolean;
  /** A permutation of basis states up to phases, for all angles. */
  monomial: boolean;
  /** Its own inverse, exactly and for all angles. */
  selfInverse: boolean;
  /** Maps Paulis to Paulis, for all angles (gates without angles only). */
  clifford: boolean;
  /** Wires (by operand) on which the gate is a mere control: it commutes with Z there. */
  controlOperands: readonly number[];
  /** The inverse as a gate of this table. */
  inverse(angles: readonly number[]): { name: string; angles: number[] };
  /** Hermitian generators, one per angle: for gates whose derivative the fit needs. */
  generator?: (angles: readonly number[]) => Float64Array[];
  /** Which dialects know it: `2.0` by the header, `3` by stdgates.inc, `own` = written with a definition. */
  known: readonly ('2.0' | '3' | 'own')[];
  source: string;
};

type Complex = readonly [number, number];
const expi = (t: number): Complex => [Math.cos(t), Math.sin(t)];

/** The Pauli matrices and the 2 x 2 identity, planar; do not write to them. */
export const PAULI = {
  I: identity(2),
  X: fromRows([
    [0, 1],
    [1, 0],
  ]),
  Y: fromRows([
    [0, [0, -1]],
    [[0, 1], 0],
  ]),
  Z: fromRows([
    [1, 0],
    [0, -1],
  ]),
} as const;

const half = (matrix: Float64Array): Float64Array => matrix.map((x) => x / 2);

/** The usual three-angle gate [[cos, -e^{il} sin], [e^{if} sin, e^{i(f+l)} cos]] times e^{i phase}. */
function threeAngles(t: number, f: number, l: number, phase: number): Float64Array {
  const c = Math.cos(t / 2);
  const s = Math.sin(t / 2);
  const scale = (size: number, angle: number): Complex => {
    const [re, im] = expi(angle + phase);
    return [size * re, size * im];
  };
  return fromRows([
    [scale(c, 0), scale(-s, l)],
    [scale(s, f), scale(c, f + l)],
  ]);
}

/** |0><0| x 1 + |1><1| x u, on one more wire than the n x n matrix u. */
export function controlled(u: Float64Array, n: number): Float64Array {
  const out = identity(2 * n);
  const d = 2 * n;
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      out[(n + i) * d + n + j] = u[i * n + j]!;
      out[d * d + (n + i) * d + n + j] = u[n * n + i * n + j]!;
    }
  }
  return out;
}

function permutation(images: readonly number[]): Float64Array {
  const n = images.length;
  const out = new Float64Array(2 * n * n);
  images.forEach((to, from) => {
    out[to * n + from] = 1;
  });
  return out;
}

/** exp(-i t/2 P) for an involution P of size n. */
function rotation(pauli: Float64Array, n: number, t: number): Float64Array {
  const out = new Float64Array(2 * n * n);
  const s = Math.sin(t / 2);
  for (let k = 0; k < n * n; k++) {
    out[k] = s * pauli[n * n + k]!;
    out[n * n + k] = -s * pauli[k]!;
  }
  for (let i = 0; i < n; i++) out[i * n + i]! += Math.cos(t / 2);
  return out;
}

const projectorOne = fromRows([
  [0, 0],
  [0, 1],
]);
const XX = kron(PAULI.X, PAULI.X, 2, 2);
const YY = kron(PAULI.Y, PAULI.Y, 2, 2);
const ZZ = kron(PAULI.Z, PAULI.Z, 2, 2);

const H_MATRIX = fromRows([
  [Math.SQRT1_2, Math.SQRT1_2],
  [Math.SQRT1_2, -Math.SQRT1_2],
]);
const SX = fromRows([
  [
    [0.5, 0.5],
    [0.5, -0.5],
  ],
  [
    [0.5, -0.5],
    [0.5, 0.5],
  ],
]);
const SXDG = fromRows([
  [
    [0.5, -0.5],
    [0.5, 0.5],
  ],
  [
    [0.5, 0.5],
    [0.5, -0.5],
  ],
]);
const phaseMatrix = (t: number): Float64Array =>
  fromRows([
    [1, 0],
    [0, expi(t)],
  ]);

const table = new Map<string, GateEntry>();

type Row = Partial<GateEntry> & Pick<GateEntry, 'matrix'>;

function add(name: string, wires: number, angles: number, row: Row): void {
  const own = { name, angles: [] };
  table.set(name, {
    name,
    wires,
    angles,
    diagonal: false,
    monomial: row.diagonal ?? false,
    selfInverse: false,
    clifford: false,
    controlOperands: row.diagonal ? Array.from({ length: wires }, (_, k) => k) : [],
    // a rotation's inverse turns back; a gate without angles must say so itself or be self-inverse
    inverse: (a) => (angles === 0 ? own : { name, angles: a.map((x) => -x) }),
    known: ['2.0', '3'],
    source: 'OpenQASM 3 standard library',
    ...row,
  });
}

const STD2 = ['2.0'] as const;
const OWN = ['2.0', 'own'] as const;

// one wire, no angle
const involution = { selfInverse: true, clifford: true } as const;
add('id', 1, 0, { matrix: () => identity(2), diagonal: true, ...involution });
add('x', 1, 0, { matrix: () => PAULI.X.slice(), monomial: true, ...involution });
add('y', 1, 0, { matrix: () => PAULI.Y.slice(), monomial: true, ...involution });
add('z', 1, 0, { matrix: () => PAULI.Z.slice(), diagonal: true, ...involution });
add('h', 1, 0, { matrix: () => H_MATRIX.slice(), ...involution });
const fixed = (name: string) => () => ({ name, angles: [] });
add('s', 1, 0, {
  matrix: () => fromRows([[1, 0], [0, [0, 1]]]), // biome-ignore format: one matrix, one line
  diagonal: true,
  clifford: true,
  inverse: fixed('sdg'),
});
add('sdg', 1, 0, {
  matrix: () => fromRows([[1, 0], [0, [0, -1]]]), // biome-ignore format: one matrix, one line
  diagonal: true,
  clifford: true,
  inverse: fixed('s'),
});
add('t', 1, 0, {
  matrix: () => fromRows([[1, 0], [0, [Math.SQRT1_2, Math.SQRT1_2]]]), // biome-ignore format: one line
  diagonal: true,
  inverse: fixed('tdg'),
});
add('tdg', 1, 0, {
  matrix: () => fromRows([[1, 0], [0, [Math.SQRT1_2, -Math.SQRT1_2]]]), // biome-ignore format: one line
  diagonal: true,
  inverse: fixed('t'),
});
add('sx', 1, 0, { matrix: () => SX.slice(), clifford: true, inverse: fixed('sxdg') });
add('sxdg', 1, 0, {
  matrix: () => SXDG.slice(),
  clifford: true,
  inverse: fixed('sx'),
  known: OWN,
  source: 'later copies of the OpenQASM 2.0 header',
});

// one wire, angles
add('rx', 1, 1, {
  matrix: ([t]) => rotation(PAULI.X, 2, t!),
  generator: () => [half(PAULI.X)],
});
add('ry', 1, 1, {
  matrix: ([t]) => rotation(PAULI.Y, 2, t!),
  generator: () => [half(PAULI.Y)],
});
add('rz', 1, 1, {
  matrix: ([t]) => rotation(PAULI.Z, 2, t!),
  diagonal: true,
  generator: () => [half(PAULI.Z)],
});
for (const name of ['p', 'u1', 'phase']) {
  add(name, 1, 1, {
    matrix: ([t]) => phaseMatrix(t!),
    diagonal: true,
    generator: () => [projectorOne.map((x) => -x)],
    known: name === 'phase' ? ['3'] : ['2.0', '3'],
  });
}
add('u2', 1, 2, {
  matrix: ([f, l]) => threeAngles(Math.PI / 2, f!, l!, -(f! + l!) / 2),
  inverse: ([f, l]) => ({ name: 'u2', angles: [-l! - Math.PI, -f! + Math.PI] }),
});
add('u3', 1, 3, {
  matrix: ([t, f, l]) => threeAngles(t!, f!, l!, -(f! + l!) / 2),
  inverse: ([t, f, l]) => ({ name: 'u3', angles: [-t!, -l!, -f!] }),
});
add('u', 1, 3, {
  matrix: ([t, f, l]) => threeAngles(t!, f!, l!, 0),
  inverse: ([t, f, l]) => ({ name: 'u', angles: [-t!, -l!, -f!] }),
  known: STD2,
  source: 'later copies of the OpenQASM 2.0 header',
});
add('U', 1, 3, {
  matrix: ([t, f, l]) => threeAngles(t!, f!, l!, t! / 2),
  inverse: ([t, f, l]) => ({ name: 'U', angles: [-t!, -l!, -f!] }),
  source: 'OpenQASM 3 built-in (2.0: the same up to phase)',
});
add('prx', 1, 2, {
  // rotation by t about the axis (cos f, sin f, 0)
  matrix: ([t, f]) => threeAngles(t!, f! - Math.PI / 2, Math.PI / 2 - f!, 0),
  inverse: ([t, f]) => ({ name: 'prx', angles: [-t!, f!] }),
  known: ['own'],
  source: 'rotation about an axis in the XY plane (common practice, no source)',
});

// two wires, no angle
const firstControl = { controlOperands: [0] } as const;
for (const name of ['cx', 'CX']) {
  add(name, 2, 0, {
    matrix: () => permutation([0, 1, 3, 2]),
    monomial: true,
    ...firstControl,
    ...involution,
  });
}
add('cy', 2, 0, {
  matrix: () => controlled(PAULI.Y, 2),
  monomial: true,
  ...firstControl,
  ...involution,
});
add('cz', 2, 0, { matrix: () => controlled(PAULI.Z, 2), diagonal: true, ...involution });
add('ch', 2, 0, { matrix: () => controlled(H_MATRIX, 2), selfInverse: true, ...firstControl });
add('csx', 2, 0, {
  matrix: () => controlled(SX, 2),
  inverse: fixed('csxdg'),
  ...firstControl,
  known: OWN,
  source: 'later copies of the OpenQASM 2.0 header',
});
add('csxdg', 2, 0, {
  matrix: () => controlled(SXDG, 2),
  inverse: fixed('csx'),
  ...firstControl,
  known: ['own'],
  source: 'inverse of csx',
});
add('swap', 2, 0, { matrix: () => permutation([0, 2, 1, 3]), monomial: true, ...involution });
add('iswap', 2, 0, {
  matrix: () => new Float64Array(32).map((_, k) => iswapEntry(k)),
  monomial: true,
  clifford: true,
  inverse: fixed('iswapdg'),
  known: ['own'],
  source: 'exp(i pi/4 (XX + YY)); Makhlin, Quantum Inf. Process. 1, 243 (2002)',
});
add('iswapdg', 2, 0, {
  matrix: () => new Float64Array(32).map((_, k) => (k < 16 ? 1 : -1) * iswapEntry(k)),
  monomial: true,
  clifford: true,
  inverse: fixed('iswap'),
  known: ['own'],
  source: 'inverse of iswap',
});
add('sqrtiswap', 2, 0, {
  matrix: () => sqrtIswap(1),
  inverse: fixed('sqrtiswapdg'),
  known: ['own'],
  source: 'exp(i pi/8 (XX + YY)); Huang et al., PRL 130, 070601 (2023)',
});
add('sqrtiswapdg', 2, 0, {
  matrix: () => sqrtIswap(-1),
  inverse: fixed('sqrtiswap'),
  known: ['own'],
  source: 'inverse of sqrtiswap',
});
add('ecr', 2, 0, {
  // (XI - YX)/sqrt2 in the order first x second: an echoed ZX rotation by pi/2 with an X on the first wire
  matrix: () => ecrMatrix(),
  selfInverse: true,
  clifford: true,
  known: ['own'],
  source:
    'echoed cross-resonance gate, exp(-i pi/4 ZX) then X on the first wire (common practice, no source)',
});
add('b', 2, 0, {
  matrix: () => bMatrix(1),
  inverse: fixed('bdg'),
  known: ['own'],
  source: 'exp(i pi/4 XX + i pi/8 YY); Zhang, Vala, Sastry, Whaley, PRL 93, 020502 (2004)',
});
add('bdg', 2, 0, {
  matrix: () => bMatrix(-1),
  inverse: fixed('b'),
  known: ['own'],
  source: 'inverse of b',
});

// two wires, angles
for (const name of ['cp', 'cphase', 'cu1']) {
  add(name, 2, 1, {
    matrix: ([t]) => controlled(phaseMatrix(t!), 2),
    diagonal: true,
    generator: () => [kron(projectorOne, projectorOne, 2, 2).map((x) => -x)],
    known: name === 'cp' ? ['2.0', '3'] : name === 'cphase' ? ['3'] : STD2,
  });
}
const conditionalRotation = (
  pauli: Float64Array,
): Partial<GateEntry> & Pick<GateEntry, 'matrix'> => ({
  matrix: ([t]) => controlled(rotation(pauli, 2, t!), 2),
  generator: () => [half(kron(projectorOne, pauli, 2, 2))],
  controlOperands: [0],
});
add('crx', 2, 1, conditionalRotation(PAULI.X));
add('cry', 2, 1, conditionalRotation(PAULI.Y));
add('crz', 2, 1, {
  ...conditionalRotation(PAULI.Z),
  diagonal: true,
  monomial: true,
  controlOperands: [0, 1],
});
add('cu', 2, 4, {
  matrix: ([t, f, l, g]) => controlled(threeAngles(t!, f!, l!, g!), 2),
  inverse: ([t, f, l, g]) => ({ name: 'cu', angles: [-t!, -l!, -f!, -g!] }),
  ...firstControl,
});
add('cu3', 2, 3, {
  matrix: ([t, f, l]) => controlled(threeAngles(t!, f!, l!, -(f! + l!) / 2), 2),
  inverse: ([t, f, l]) => ({ name: 'cu3', angles: [-t!, -l!, -f!] }),
  ...firstControl,
  known: STD2,
  source:
    'OpenQASM 2.0 header of the paper: controlled Rz Ry Rz (later copies of it add a phase (f+l)/2 on the control)',
});
for (const [name, pauli] of [
  ['rxx', XX],
  ['ryy', YY],
  ['rzz', ZZ],
] as const) {
  add(name, 2, 1, {
    matrix: ([t]) => rotation(pauli, 4, t!),
    generator: () => [half(pauli)],
    diagonal: name === 'rzz',
    known: name === 'ryy' ? ['own'] : OWN,
    source: 'exp(-i t/2 PP); later copies of the OpenQASM 2.0 header',
  });
}

// three wires and more
add('ccx', 3, 0, {
  matrix: () => permutation([0, 1, 2, 3, 4, 5, 7, 6]),
  monomial: true,
  selfInverse: true,
  controlOperands: [0, 1],
});
add('ccz', 3, 0, {
  matrix: () => controlled(controlled(PAULI.Z, 2), 4),
  diagonal: true,
  selfInverse: true,
  known: ['own'],
  source: 'doubly controlled Z',
});
add('cswap', 3, 0, {
  matrix: () => permutation([0, 1, 2, 3, 4, 6, 5, 7]),
  monomial: true,
  selfInverse: true,
  controlOperands: [0],
});
add('rccx', 3, 0, {
  matrix: () => relativePhaseToffoli(),
  monomial: true,
  selfInverse: true,
  controlOperands: [0, 1],
  known: OWN,
  source: 'relative-phase Toffoli; Song, Klappenecker, quant-ph/0312225; later 2.0 headers',
});
add('c3x', 4, 0, {
  matrix: () => controlled(controlled(controlled(PAULI.X, 2), 4), 8),
  monomial: true,
  selfInverse: true,
  controlOperands: [0, 1, 2],
  known: OWN,
  source: 'later copies of the OpenQASM 2.0 header',
});
add('c4x', 5, 0, {
  matrix: () => controlled(controlled(controlled(controlled(PAULI.X, 2), 4), 8), 16),
  monomial: true,
  selfInverse: true,
  controlOperands: [0, 1, 2, 3],
  known: OWN,
  source: 'later copies of the OpenQASM 2.0 header',
});
add('c3sqrtx', 4, 0, {
  matrix: () => controlled(controlled(controlled(SX, 2), 4), 8),
  inverse: fixed('c3sqrtxdg'),
  controlOperands: [0, 1, 2],
  known: OWN,
  source: 'later copies of the OpenQASM 2.0 header',
});
add('c3sqrtxdg', 4, 0, {
  matrix: () => controlled(controlled(controlled(SXDG, 2), 4), 8),
  inverse: fixed('c3sqrtx'),
  controlOperands: [0, 1, 2],
  known: ['own'],
  source: 'inverse of c3sqrtx',
});

function iswapEntry(k: number): number {
  // real: |00>, |11>; imaginary: i between |01> and |10>
  return k === 0 || k === 15 || k === 16 + 6 || k === 16 + 9 ? 1 : 0;
}

function sqrtIswap(sign: 1 | -1): Float64Array {
  const r: Complex = [Math.SQRT1_2, 0];
  const i: Complex = [0, sign * Math.SQRT1_2];
  return fromRows([
    [1, 0, 0, 0],
    [0, r, i, 0],
    [0, i, r, 0],
    [0, 0, 0, 1],
  ]);
}

function ecrMatrix(): Float64Array {
  const r = Math.SQRT1_2;
  const i: Complex = [0, r];
  const m: Complex = [0, -r];
  return fromRows([
    [0, 0, r, i],
    [0, 0, i, r],
    [r, m, 0, 0],
    [m, r, 0, 0],
  ]);
}

function bMatrix(sign: 1 | -1): Float64Array {
  // XX and YY commute; on span{00,11} they are X and -X, on span{01,10} both are X
  const outer = sign * (Math.PI / 8);
  const inner = sign * ((3 * Math.PI) / 8);
  const pair = (t: number): [Complex, Complex] => [
    [Math.cos(t), 0],
    [0, Math.sin(t)],
  ];
  const [co, so] = pair(outer);
  const [ci, si] = pair(inner);
  return fromRows([
    [co, 0, 0, so],
    [0, ci, si, 0],
    [0, si, ci, 0],
    [so, 0, 0, co],
  ]);
}

function relativePhaseToffoli(): Float64Array {
  // the 2.0 header's circuit: u2(0,pi) u1(pi/4) cx u1(-pi/4) cx u1(pi/4) cx u1(-pi/4) u2(0,pi) on the target:
  // a Toffoli, times -1 on |101>, and i, -i between |110> and |111>
  const out = identity(8);
  out[5 * 8 + 5] = -1;
  out[6 * 8 + 6] = 0;
  out[7 * 8 + 7] = 0;
  out[64 + 6 * 8 + 7] = -1;
  out[64 + 7 * 8 + 6] = 1;
  return out;
}

/** Every gate by its name; `gphase` and `unitary` are not in the table. */
export const gateTable: ReadonlyMap<string, GateEntry> = table;
