/**
 * Takes a two-wire gate apart into what entangles and what is local: the canonical (KAK) decomposition.
 *
 * Shape: u is 4 x 4, planar. Result: u = e^{i phase} (a1 x a2) exp(i (c1 XX + c2 YY + c3 ZZ)) (b1 x b2), local factors
 * 2 x 2, planar, of determinant 1.
 * Convention: pi/4 >= c1 >= c2 >= |c3|, and c3 >= 0 where c1 = pi/4 (Weyl chamber; Zhang, Vala, Sastry, Whaley, PRA 67,
 * 042313 (2003)). In units of pi/4 these are the coordinates of reports.
 * Method: in the magic basis local gates are real orthogonal and XX, YY, ZZ diagonal (Hill, Wootters, PRL 78, 5022
 * (1997); Kraus, Cirac, PRA 63, 062309 (2001)). The real and imaginary parts of m = U^T U commute and are symmetric; real
 * Jacobi rotations diagonalise both at once, which needs no care for repeated eigenvalues.
 * Changed: the entries of O1 are taken from U P diag and cleaned by one Newton step towards the orthogonal group.
 * Cost: a few thousand flops. Fails: never for unitary input; rounding of the input shows in the recomposition.
 */
import { mul, mulInto } from '../numeric/complex-matrix.ts';

export type Canonical = {
  phase: number;
  a1: Float64Array;
  a2: Float64Array;
  b1: Float64Array;
  b2: Float64Array;
  /** In radians, in the chamber. */
  c: [number, number, number];
};

/** Differences of coordinates below this count as equality on the walls of the chamber. */
export const WALL_TOLERANCE = 1e-9;

const R = Math.SQRT1_2;
/** Magic basis in columns: (|00>+|11>, i(|01>+|10>), |01>-|10>, i(|00>-|11>))/sqrt2. */
const MAGIC_RE = [R, 0, 0, 0, 0, 0, R, 0, 0, 0, -R, 0, R, 0, 0, 0];
const MAGIC_IM = [0, 0, 0, R, 0, R, 0, 0, 0, R, 0, 0, 0, 0, 0, -R];
const MAGIC = Float64Array.from([...MAGIC_RE, ...MAGIC_IM]);
const MAGIC_DAG = dagger(MAGIC);
/** Eigenvalues of XX, YY, ZZ on the magic basis. */
const SIGNS = [
  [1, 1, -1, -1],
  [-1, 1, -1, 1],
  [1, -1, -1, 1],
] as const;

function dagger(a: Float64Array): Float64Array {
  const out = new Float64Array(32);
  for (let i = 0; i < 4; i++) {
    for (let j = 0; j < 4; j++) {
      out[j * 4 + i] = a[i * 4 + j]!;
      out[16 + j * 4 + i] = -a[16 + i * 4 + j]!;
    }
  }
  return out;
}

/** u in the magic basis, divided by the fourth root of its determinant: in SU(4). */
function inMagicBasis(u: Float64Array): { m: Float64Array; phase: number } {
  const half = mulInto(new Float64Array(32), MAGIC_DAG, u, 4, 4, 4);
  const m = mulInto(new Float64Array(32), half, MAGIC, 4, 4, 4);
  const phase = determinantPhase(m) / 4;
  const [c, s] = [Math.cos(phase), -Math.sin(phase)];
  for (let k = 0; k < 16; k++) {
    const [x, y] = [m[k]!, m[16 + k]!];
    m[k] = c * x - s * y;
    m[16 + k] = c * y + s * x;
  }
  return { m, phase };
}

/** Phase of the determinant of a 4 x 4 unitary, by elimination with pivoting. */
function determinantPhase(u: Float64Array): number {
  const a = u.slice();
  let phase = 0;
  for (let k = 0; k < 4; k++) {
    let pivot = k;
    const size = (r: number): number => a[r * 4 + k]! ** 2 + a[16 + r * 4 + k]! ** 2;
    for (let r = k + 1; r < 4; r++) if (size(r) > size(pivot)) pivot = r;
    if (pivot !== k) {
      phase += Math.PI;
      for (let j = 0; j < 4; j++) {
        for (const base of [0, 16]) {
          const t = a[base + k * 4 + j]!;
          a[base + k * 4 + j] = a[base + pivot * 4 + j]!;
          a[base + pivot * 4 + j] = t;
        }
      }
    }
    const [pr, pi] = [a[k * 4 + k]!, a[16 + k * 4 + k]!];
    phase += Math.atan2(pi, pr);
    const norm = pr * pr + pi * pi;
    for (let r = k + 1; r < 4; r++) {
      const [xr, xi] = [a[r * 4 + k]!, a[16 + r * 4 + k]!];
      const [fr, fi] = [(xr * pr + xi * pi) / norm, (xi * pr - xr * pi) / norm];
      for (let j = k; j < 4; j++) {
        const [yr, yi] = [a[k * 4 + j]!, a[16 + k * 4 + j]!];
        a[r * 4 + j]! -= fr * yr - fi * yi;
        a[16 + r * 4 + j]! -= fr * yi + fi * yr;
      }
    }
  }
  return phase;
}

/** m^T m. */
function gamma(m: Float64Array): Float64Array {
  const out = new Float64Array(32);
  for (let i = 0; i < 4; i++) {
    for (let j = i; j < 4; j++) {
      let [re, im] = [0, 0];
      for (let k = 0; k < 4; k++) {
        const [a, b] = [m[k * 4 + i]!, m[16 + k * 4 + i]!];
        const [c, d] = [m[k * 4 + j]!, m[16 + k * 4 + j]!];
        re += a * c - b * d;
        im += a * d + b * c;
      }
      out[i * 4 + j] = re;
      out[j * 4 + i] = re;
      out[16 + i * 4 + j] = im;
      out[16 + j * 4 + i] = im;
    }
  }
  return out;
}

/**
 * Real orthogonal p (in place of the identity given) that diagonalises the commuting symmetric real and imaginary
 * parts of g (in place): Jacobi angles for two matrices at once (Cardoso, Souloumiac 1996).
 */
function diagonaliseTogether(g: Float64Array, p: Float64Array): void {
  for (let sweep = 0; sweep < 40; sweep++) {
    let turned = false;
    for (let i = 0; i < 3; i++) {
      for (let j = i + 1; j < 4; j++) {
        const [x, y] = [g[i * 5]! - g[j * 5]!, g[16 + i * 5]! - g[16 + j * 5]!];
        const [u, v] = [2 * g[i * 4 + j]!, 2 * g[16 + i * 4 + j]!];
        if (Math.abs(u) + Math.abs(v) < 1e-16) continue;
        const on = x * x + y * y - u * u - v * v;
        const off = 2 * (x * u + y * v);
        const theta = Math.atan2(off, on) / 4;
        if (Math.abs(theta) < 1e-17) continue;
        turned = true;
        const [c, s] = [Math.cos(theta), Math.sin(theta)];
        turnPair(g, 0, i, j, c, s);
        turnPair(g, 16, i, j, c, s);
        for (let k = 0; k < 4; k++) {
          const [a, b] = [p[k * 4 + i]!, p[k * 4 + j]!];
          p[k * 4 + i] = c * a + s * b;
          p[k * 4 + j] = c * b - s * a;
        }
      }
    }
    if (!turned) return;
  }
}

function turnPair(g: Float64Array, base: number, i: number, j: number, c: number, s: number): void {
  for (let k = 0; k < 4; k++) {
    const [a, b] = [g[base + k * 4 + i]!, g[base + k * 4 + j]!];
    g[base + k * 4 + i] = c * a + s * b;
    g[base + k * 4 + j] = c * b - s * a;
  }
  for (let k = 0; k < 4; k++) {
    const [a, b] = [g[base + i * 4 + k]!, g[base + j * 4 + k]!];
    g[base + i * 4 + k] = c * a + s * b;
    g[base + j * 4 + k] = c * b - s * a;
  }
}

function realDeterminant(p: Float64Array): number {
  const minor = (a: number, b: number, c: number, d: number): number =>
    p[a]! * p[d]! - p[b]! * p[c]!;
  // Laplace expansion by the first two rows
  return (
    minor(0, 1, 4, 5) * minor(10, 11, 14, 15) -
    minor(0, 2, 4, 6) * minor(9, 11, 13, 15) +
    minor(0, 3, 4, 7) * minor(9, 10, 13, 14) +
    minor(1, 2, 5, 6) * minor(8, 11, 12, 15) -
    minor(1, 3, 5, 7) * minor(8, 10, 12, 14) +
    minor(2, 3, 6, 7) * minor(8, 9, 12, 13)
  );
}

export function canonical(u: Float64Array): Canonical {
  const { m, phase } = inMagicBasis(u);
  const g = gamma(m);
  const p = new Float64Array(32);
  for (let k = 0; k < 4; k++) p[k * 5] = 1;
  diagonaliseTogether(g, p);
  if (realDeterminant(p) < 0) for (let k = 0; k < 4; k++) p[k * 4] = -p[k * 4]!;
  const angles = [0, 1, 2, 3].map((k) => Math.atan2(g[16 + k * 5]!, g[k * 5]!) / 2);
  // o = m p e^{-i angles} is real up to rounding
  const mp = mul(m, p, 4);
  const o = new Float64Array(32);
  const fill = (k: number): void => {
    const [c, s] = [Math.cos(angles[k]!), -Math.sin(angles[k]!)];
    for (let r = 0; r < 4; r++) o[r * 4 + k] = c * mp[r * 4 + k]! - s * mp[16 + r * 4 + k]!;
  };
  for (let k = 0; k < 4; k++) fill(k);
  if (realDeterminant(o) < 0) {
    angles[0] = angles[0]! + Math.PI;
    fill(0);
  }
  const [a1, a2] = localFactors(mul(mul(MAGIC, o, 4), MAGIC_DAG, 4));
  const pt = new Float64Array(32);
  for (let i = 0; i < 4; i++) for (let j = 0; j < 4; j++) pt[i * 4 + j] = p[j * 4 + i]!;
  const [b1, b2] = localFactors(mul(mul(MAGIC, pt, 4), MAGIC_DAG, 4));
  const sum = (signs: readonly number[]): number =>
    signs.reduce((total, sign, k) => total + sign * angles[k]!, 0) / 4;
  const result: Canonical = {
    phase: phase + sum([1, 1, 1, 1]),
    a1,
    a2,
    b1,
    b2,
    c: [sum(SIGNS[0]), sum(SIGNS[1]), sum(SIGNS[2])],
  };
  return intoChamber(result);
}

/** The factors of a 4 x 4 tensor product of determinant 1, each of determinant 1. */
function localFactors(k: Float64Array): [Float64Array, Float64Array] {
  // the largest 2 x 2 block is the second factor times an entry of the first
  let block = 0;
  let best = -1;
  for (const at of [0, 2, 8, 10]) {
    let size = 0;
    for (const offset of [0, 1, 4, 5]) size += k[at + offset]! ** 2 + k[16 + at + offset]! ** 2;
    if (size > best) [best, block] = [size, at];
  }
  const second = new Float64Array(8);
  [0, 1, 4, 5].forEach((offset, i) => {
    second[i] = k[block + offset]!;
    second[4 + i] = k[16 + block + offset]!;
  });
  toDeterminantOne(second);
  // first_ij = Tr(second^dag block_ij)/2
  const first = new Float64Array(8);
  [0, 2, 8, 10].forEach((at, i) => {
    [0, 1, 4, 5].forEach((offset, q) => {
      const [a, b] = [second[q]!, second[4 + q]!];
      const [c, d] = [k[at + offset]!, k[16 + at + offset]!];
      first[i]! += (a * c + b * d) / 2;
      first[4 + i]! += (a * d - b * c) / 2;
    });
  });
  toDeterminantOne(first);
  return [first, second];
}

/** Scales a multiple of a 2 x 2 unitary to determinant 1 and cleans its rounding: [[x, -y*], [y, x*]]. */
function toDeterminantOne(u: Float64Array): void {
  const [ar, br, cr, dr, ai, bi, ci, di] = u as unknown as [
    number, number, number, number, number, number, number, number,
  ]; // biome-ignore format: the eight numbers of a 2 x 2 matrix
  const re = ar * dr - ai * di - br * cr + bi * ci;
  const im = ar * di + ai * dr - br * ci - bi * cr;
  const half = Math.atan2(im, re) / 2;
  const scale = 1 / Math.sqrt(Math.hypot(re, im));
  const [c, s] = [Math.cos(half) * scale, -Math.sin(half) * scale];
  const turn = (x: number, y: number): [number, number] => [c * x - s * y, c * y + s * x];
  const [a, b, e, d] = [turn(ar, ai), turn(br, bi), turn(cr, ci), turn(dr, di)];
  let [xr, xi] = [(a[0] + d[0]) / 2, (a[1] - d[1]) / 2];
  let [yr, yi] = [(e[0] - b[0]) / 2, (e[1] + b[1]) / 2];
  const norm = Math.hypot(xr, xi, yr, yi);
  [xr, xi, yr, yi] = [xr / norm, xi / norm, yr / norm, yi / norm];
  u.set([xr, -yr, yr, xr, xi, yi, yi, -xi]);
}

const I_PAULI = [
  new Float64Array([0, 0, 0, 0, 0, 1, 1, 0]),
  new Float64Array([0, 1, -1, 0, 0, 0, 0, 0]),
  new Float64Array([0, 0, 0, 0, 1, 0, 0, -1]),
]; // i X, i Y, i Z: determinant 1

/** Moves the coordinates into the chamber; the local factors follow. */
function intoChamber(k: Canonical): Canonical {
  const { c } = k;
  for (let axis = 0; axis < 3; axis++) shiftInto(k, axis);
  for (const [i, j] of [
    [0, 1],
    [1, 2],
    [0, 1],
  ] as const) {
    if (Math.abs(c[i]) < Math.abs(c[j])) exchange(k, i, j);
  }
  if (c[0] < 0) flipSigns(k, 0, c[1] < 0 ? 1 : 2);
  if (c[1] < 0) flipSigns(k, 1, 2);
  if (c[2] < 0 && c[0] > Math.PI / 4 - WALL_TOLERANCE) {
    shift(k, 0, -1);
    flipSigns(k, 0, 2);
  }
  return k;
}

/** exp(i pi/2 PP) = i PP: takes n quarter turns out of one coordinate. */
function shift(k: Canonical, axis: number, n: number): void {
  k.c[axis]! += n * (Math.PI / 2);
  // exp(i c PP) = exp(i (c + n pi/2) PP) (-i PP)^n, and PP = -(iP x iP)
  const turns = ((-n % 4) + 4) % 4;
  for (let t = 0; t < turns; t++) {
    // i PP = -i (iP x iP)
    k.b1 = mul(I_PAULI[axis]!, k.b1, 2);
    k.b2 = mul(I_PAULI[axis]!, k.b2, 2);
    k.phase -= Math.PI / 2;
  }
}

function shiftInto(k: Canonical, axis: number): void {
  const n = -Math.round(k.c[axis]! / (Math.PI / 2));
  if (n !== 0) shift(k, axis, n);
  if (k.c[axis]! < -Math.PI / 4 + 1e-15) shift(k, axis, 1);
}

/** (1 + i P)/sqrt2 on both wires: exchanges the other two axes (with one sign each, twice: none). */
function exchange(k: Canonical, i: number, j: number): void {
  const axis = 3 - i - j;
  const turn = I_PAULI[axis]!.map((x, at) => R * (x + (at === 0 || at === 3 ? 1 : 0)));
  const back = I_PAULI[axis]!.map((x, at) => R * ((at === 0 || at === 3 ? 1 : 0) - x));
  k.a1 = mul(k.a1, back, 2);
  k.a2 = mul(k.a2, back, 2);
  k.b1 = mul(turn, k.b1, 2);
  k.b2 = mul(turn, k.b2, 2);
  [k.c[i], k.c[j]] = [k.c[j]!, k.c[i]!];
}

/** A Pauli on the first wire flips the signs of the other two coordinates. */
function flipSigns(k: Canonical, i: number, j: number): void {
  const axis = 3 - i - j;
  const minus = I_PAULI[axis]!.map((x) => -x);
  k.a1 = mul(k.a1, minus, 2);
  k.b1 = mul(I_PAULI[axis]!, k.b1, 2);
  k.c[i] = -k.c[i]!;
  k.c[j] = -k.c[j]!;
}

/** exp(i (c1 XX + c2 YY + c3 ZZ)), planar 4 x 4. */
export function canonicalGate([c1, c2, c3]: readonly [number, number, number]): Float64Array {
  const out = new Float64Array(32);
  const set = (i: number, j: number, re: number, im: number): void => {
    out[i * 4 + j] = re;
    out[16 + i * 4 + j] = im;
  };
  // on span{00, 11}: ZZ = 1, XX = X, YY = -X; on span{01, 10}: ZZ = -1, XX = YY = X
  const [p, m] = [c1 - c2, c1 + c2];
  const [cz, sz] = [Math.cos(c3), Math.sin(c3)];
  for (const [i, j, angle, sign] of [
    [0, 3, p, 1],
    [1, 2, m, -1],
  ] as const) {
    const [c, s] = [Math.cos(angle), Math.sin(angle)];
    for (const [r, t] of [
      [i, j],
      [j, i],
    ] as const) {
      set(r, r, c * cz, sign * c * sz);
      set(r, t, -sign * s * sz, s * cz);
    }
  }
  return out;
}

export type Makhlin = { g1: [number, number]; g2: number };

/** Local invariants of a two-wire gate (Makhlin, Quantum Inf. Process. 1, 243 (2002)). */
export function makhlinInvariants(u: Float64Array): Makhlin {
  const g = gamma(inMagicBasis(u).m);
  let [tr, ti] = [0, 0];
  for (let k = 0; k < 4; k++) {
    tr += g[k * 5]!;
    ti += g[16 + k * 5]!;
  }
  let square = 0;
  for (let i = 0; i < 4; i++) {
    for (let j = 0; j < 4; j++) {
      square += g[i * 4 + j]! * g[j * 4 + i]! - g[16 + i * 4 + j]! * g[16 + j * 4 + i]!;
    }
  }
  const [re, im] = [tr * tr - ti * ti, 2 * tr * ti];
  return { g1: [re / 16, im / 16], g2: (re - square) / 4 };
}

/** Fewest CX for the gate (Shende, Bullock, Markov, PRA 70, 012310 (2004)), from its coordinates. */
export function cxCount([c1, c2, c3]: readonly [number, number, number]): 0 | 1 | 2 | 3 {
  if (Math.abs(c3) > WALL_TOLERANCE) return 3;
  if (c2 > WALL_TOLERANCE) return 2;
  if (c1 < WALL_TOLERANCE) return 0;
  return Math.abs(c1 - Math.PI / 4) < WALL_TOLERANCE ? 1 : 2;
}
