/**
 * Sweeps over a chain of gates with open angles in plain TypeScript: how far the chain is from a unitary, with gradient and
 * Gauss-Newton matrix. The twin of the compiled module.
 *
 * Shape: d x d matrices planar; d = 2^n. A step is four integers: kind, stride of its wire, stride of its second wire, index.
 *   Kinds 0, 1, 2: exp(-i t P/2) about x, y, z, index = its angle; kind 3: CX, control first; kind 4: the 4 x 4 matrix at
 *   `matrices[32 index]`. `turns` holds cos(t/2), sin(t/2) of every angle.
 * Method: reshape/objective.ts. P' = 2 B^dag B - 1 with B the rows of X in the +1 eigenspace of P. Rows of the Jacobian
 *   are packed: the diagonal, real parts times sqrt 2 above it, imaginary parts times sqrt 2 below it (of the transposed
 *   place), so that a dot product is a trace. `slopeOf` needs no Jacobian: A = X S goes along with X, and an entry of the
 *   gradient is Tr(P A X^dag)/2.
 * Cost: `lineariseInto` d^3 an angle and p^2 d^2 / 2 multiply-adds; `slopeInto` about 12 d^2 multiply-adds a step.
 * Symbols: X = the product so far, V = that of all steps, U = the target, S = (W^dag - W)/(2i), W = e^{-i phi} U^dag V.
 */
export type Sweep = {
  d: number;
  /** Number of angles. */
  angles: number;
  steps: Int32Array;
  matrices: Float64Array;
};

/** x = the product of all steps. */
export function evolveInto(x: Float64Array, sweep: Sweep, turns: Float64Array): Float64Array {
  reset(x, sweep.d);
  for (let step = 0; step < sweep.steps.length; step += 4) advance(x, sweep, step, turns);
  return x;
}

/** F = |U - e^{-i phi} V|^2 / 2. */
export function gapOf(sweep: Sweep, turns: Float64Array, target: Float64Array): number {
  const x = evolveInto(new Float64Array(target.length), sweep, turns);
  return gapInto(new Float64Array(target.length), x, target, [0, 0]);
}

/** F; fills its gradient. */
export function slopeInto(
  gradient: Float64Array,
  sweep: Sweep,
  turns: Float64Array,
  target: Float64Array,
): number {
  const { d, steps } = sweep;
  const x = evolveInto(new Float64Array(target.length), sweep, turns);
  const { value, s } = tiltOf(x, target, d);
  reset(x, d);
  for (let step = 0; step < steps.length; step += 4) {
    advance(x, sweep, step, turns);
    advance(s, sweep, step, turns);
    const kind = steps[step]!;
    if (kind < 3) gradient[steps[step + 3]!] = overlap(x, s, d, steps[step + 1]!, kind) / 2;
  }
  return value;
}

/** x = the product of all steps; fills the packed P'/2 of every angle, angles x d^2. */
export function rowsInto(
  rows: Float64Array,
  x: Float64Array,
  sweep: Sweep,
  turns: Float64Array,
): Float64Array {
  const { d, steps } = sweep;
  const width = d * d;
  const half = new Float64Array(width);
  reset(x, d);
  for (let step = 0; step < steps.length; step += 4) {
    advance(x, sweep, step, turns);
    const kind = steps[step]!;
    if (kind < 3) pauliInto(rows, steps[step + 3]! * width, x, half, d, steps[step + 1]!, kind);
  }
  return x;
}

/** F; fills the gradient and the rows of the Jacobian, angles x d^2. */
export function jacobianInto(
  rows: Float64Array,
  gradient: Float64Array,
  sweep: Sweep,
  turns: Float64Array,
  target: Float64Array,
): number {
  const { d, angles } = sweep;
  const width = d * d;
  const x = rowsInto(rows, new Float64Array(2 * width), sweep, turns);
  const { value, s } = tiltOf(x, target, d);
  const packed = new Float64Array(width);
  for (let i = 0; i < d; i++) {
    packed[i * d + i] = s[i * d + i]!;
    for (let j = i + 1; j < d; j++) {
      packed[i * d + j] = Math.SQRT2 * s[i * d + j]!;
      packed[j * d + i] = Math.SQRT2 * s[width + i * d + j]!;
    }
  }
  for (let k = 0; k < angles; k++) {
    let [even, odd] = [0, 0];
    for (let i = 0; i < width; i += 2) {
      even += rows[k * width + i]! * packed[i]!;
      odd += rows[k * width + i + 1]! * packed[i + 1]!;
    }
    gradient[k] = even + odd;
  }
  return value;
}

function reset(x: Float64Array, d: number): void {
  x.fill(0);
  for (let i = 0; i < d; i++) x[i * d + i] = 1;
}

/** One step on the rows of x. */
function advance(x: Float64Array, sweep: Sweep, step: number, turns: Float64Array): void {
  const { d, steps, matrices } = sweep;
  const [kind, first, second, index] = [
    steps[step]!,
    steps[step + 1]!,
    steps[step + 2]!,
    steps[step + 3]!,
  ];
  if (kind < 3) rotateRows(x, d, first, kind, turns[2 * index]!, turns[2 * index + 1]!);
  else if (kind === 3) swapControlled(x, d, first, second);
  else applyPair(x, d, matrices.subarray(32 * index, 32 * index + 32), first, second);
}

/** Rows of x turned by exp(-i t P/2) on the wire of this stride, P = X, Y, Z for axis 0, 1, 2; c, s = cos, sin of t/2. */
export function rotateRows(
  x: Float64Array,
  d: number,
  stride: number,
  axis: number,
  c: number,
  s: number,
): void {
  const im = d * d;
  const run = stride * d;
  for (let block = 0; block < im; block += 2 * run) {
    for (let p = block; p < block + run; p++) {
      const q = p + run;
      const [a, b, e, f] = [x[p]!, x[im + p]!, x[q]!, x[im + q]!];
      if (axis === 0) {
        x[p] = c * a + s * f;
        x[im + p] = c * b - s * e;
        x[q] = c * e + s * b;
        x[im + q] = c * f - s * a;
      } else if (axis === 1) {
        x[p] = c * a - s * e;
        x[im + p] = c * b - s * f;
        x[q] = c * e + s * a;
        x[im + q] = c * f + s * b;
      } else {
        x[p] = c * a + s * b;
        x[im + p] = c * b - s * a;
        x[q] = c * e - s * f;
        x[im + q] = c * f + s * e;
      }
    }
  }
}

/** CX on the rows of x. */
export function swapControlled(x: Float64Array, d: number, control: number, target: number): void {
  const im = d * d;
  for (let row = 0; row < d; row++) {
    if ((row & control) === 0 || (row & target) !== 0) continue;
    for (const base of [row * d, im + row * d]) {
      const other = base + target * d;
      for (let k = 0; k < d; k++) {
        const t = x[base + k]!;
        x[base + k] = x[other + k]!;
        x[other + k] = t;
      }
    }
  }
}

/** The planar 4 x 4 matrix m on the rows of x; the first wire is the more significant. */
export function applyPair(
  x: Float64Array,
  d: number,
  m: Float64Array,
  first: number,
  second: number,
): void {
  const im = d * d;
  const at = [0, second * d, first * d, (first + second) * d];
  const [re, imag] = [
    [0, 0, 0, 0],
    [0, 0, 0, 0],
  ];
  for (let row = 0; row < d; row++) {
    if ((row & (first | second)) !== 0) continue;
    for (let k = row * d; k < row * d + d; k++) {
      for (let r = 0; r < 4; r++) {
        re[r] = x[k + at[r]!]!;
        imag[r] = x[im + k + at[r]!]!;
      }
      for (let r = 0; r < 4; r++) {
        let [a, b] = [0, 0];
        for (let s = 0; s < 4; s++) {
          const mr = m[4 * r + s]!;
          const mi = m[16 + 4 * r + s]!;
          a += mr * re[s]! - mi * imag[s]!;
          b += mr * imag[s]! + mi * re[s]!;
        }
        x[k + at[r]!] = a;
        x[im + k + at[r]!] = b;
      }
    }
  }
}

/** Packed X^dag P X / 2 at `at`; `half` is room for the rows of its positive part. */
function pauliInto(
  out: Float64Array,
  at: number,
  x: Float64Array,
  half: Float64Array,
  d: number,
  stride: number,
  axis: number,
): void {
  const im = d * d;
  const ih = im / 2;
  const run = stride * d;
  let h = 0;
  for (let block = 0; block < im; block += 2 * run) {
    for (let p = block; p < block + run; p++, h++) {
      const q = p + run;
      half[h] = axis === 0 ? x[p]! + x[q]! : axis === 1 ? x[p]! + x[im + q]! : x[p]!;
      const below = x[im + p]!;
      half[ih + h] = axis === 0 ? below + x[im + q]! : axis === 1 ? below - x[q]! : below;
    }
  }
  const f = axis === 2 ? 1 : 0.5;
  const g = f * Math.SQRT2;
  for (let i = 0; i < d; i++) {
    for (let j = i; j < d; j++) {
      let [re, imag] = [0, 0];
      for (let r = 0; r < ih; r += d) {
        const [br, bi] = [half[r + i]!, half[ih + r + i]!];
        const [cr, ci] = [half[r + j]!, half[ih + r + j]!];
        re += br * cr + bi * ci;
        imag += br * ci - bi * cr;
      }
      if (i === j) {
        out[at + i * d + i] = f * re - 0.5;
      } else {
        out[at + i * d + j] = g * re;
        out[at + j * d + i] = g * imag;
      }
    }
  }
}

/** |U - e^{-i phi} V|^2 / 2; leaves the gap in w and cos, sin of -phi in `phase`. */
function gapInto(
  w: Float64Array,
  x: Float64Array,
  target: Float64Array,
  phase: [number, number],
): number {
  const size = target.length / 2;
  const [re, im, total] = [
    [0, 0],
    [0, 0],
    [0, 0],
  ];
  for (let i = 0; i < size; i++) {
    const [u, v, ui, vi] = [target[i]!, x[i]!, target[size + i]!, x[size + i]!];
    re[i & 1]! += u * v + ui * vi;
    im[i & 1]! += u * vi - ui * v;
  }
  const [a, b] = [re[0]! + re[1]!, im[0]! + im[1]!];
  const norm = Math.sqrt(a * a + b * b);
  const [c, s] = norm === 0 ? [1, 0] : [a / norm, -b / norm];
  phase[0] = c;
  phase[1] = s;
  for (let i = 0; i < size; i++) {
    const [v, vi] = [x[i]!, x[size + i]!];
    // the gap itself keeps its digits when both are nearly equal
    const p = target[i]! - (c * v - s * vi);
    const q = target[size + i]! - (c * vi + s * v);
    w[i] = p;
    w[size + i] = q;
    total[i & 1]! += p * p + q * q;
  }
  return (total[0]! + total[1]!) / 2;
}

/** F and S for V in x: with R = V^dag (U - e^{-i phi} V) e^{i phi}, S = (R - R^dag)/(2i). */
function tiltOf(
  x: Float64Array,
  target: Float64Array,
  d: number,
): { value: number; s: Float64Array } {
  const size = d * d;
  const w = new Float64Array(2 * size);
  const phase: [number, number] = [1, 0];
  const value = gapInto(w, x, target, phase);
  const r = new Float64Array(2 * size);
  for (let k = 0; k < size; k += d) {
    for (let i = 0; i < d; i++) {
      const [br, bi] = [x[k + i]!, x[size + k + i]!];
      for (let j = 0; j < d; j++) {
        const [cr, ci] = [w[k + j]!, w[size + k + j]!];
        r[i * d + j]! += br * cr + bi * ci;
        r[size + i * d + j]! += br * ci - bi * cr;
      }
    }
  }
  const [c, s] = [phase[0], -phase[1]];
  for (let i = 0; i < d; i++) {
    for (let j = i; j < d; j++) {
      const [a, b] = [i * d + j, j * d + i];
      const [pr, pi, qr, qi] = [r[a]!, r[size + a]!, r[b]!, r[size + b]!];
      const re = (c * pi + s * pr + (c * qi + s * qr)) / 2;
      const im = (c * qr - s * qi - (c * pr - s * pi)) / 2;
      r[a] = re;
      r[b] = re;
      r[size + b] = -im;
      r[size + a] = i === j ? 0 : im;
    }
  }
  return { value, s: r };
}

/** Re Tr(P A X^dag). */
function overlap(
  x: Float64Array,
  a: Float64Array,
  d: number,
  stride: number,
  axis: number,
): number {
  const im = d * d;
  const run = stride * d;
  const sums = [0, 0];
  for (let block = 0; block < im; block += 2 * run) {
    for (let p = block; p < block + run; p++) {
      const q = p + run;
      const [tr, ti, br, bi] = [x[p]!, x[im + p]!, x[q]!, x[im + q]!];
      const [er, ei, fr, fi] = [a[p]!, a[im + p]!, a[q]!, a[im + q]!];
      let s = sums[p & 1]!;
      if (axis === 0) {
        s += er * br + ei * bi;
        s += fr * tr + fi * ti;
      } else if (axis === 1) {
        s += fi * tr - fr * ti;
        s += er * bi - ei * br;
      } else {
        s += er * tr + ei * ti;
        s -= fr * br + fi * bi;
      }
      sums[p & 1] = s;
    }
  }
  return sums[0]! + sums[1]!;
}
