/**
 * Sweeps over a chain of gates with 128-bit vectors of two doubles; the twin is ../plain-sweep.ts.
 *
 * Shape: arguments are byte addresses; d x d matrices planar row-major. A step is four 32-bit integers and an angle a pair of
 * doubles, as said in the twin, and every sum runs in the order of the twin.
 */

// @ts-nocheck: compiled by AssemblyScript
import { gram } from './kernels';

@inline
function at(p: usize): v128 { return v128.load(p); }
@inline
function sum(v: v128): f64 { return f64x2.extract_lane(v, 0) + f64x2.extract_lane(v, 1); }
@inline
function plus(x: v128, a: v128, b: v128, c: v128, e: v128): v128 {
  return f64x2.add(x, f64x2.add(f64x2.mul(a, b), f64x2.mul(c, e)));
}
@inline
function minus(x: v128, a: v128, b: v128, c: v128, e: v128): v128 {
  return f64x2.add(x, f64x2.sub(f64x2.mul(a, b), f64x2.mul(c, e)));
}
@inline
function add2(a: v128, b: v128, c: v128, e: v128): v128 {
  return f64x2.add(f64x2.mul(a, b), f64x2.mul(c, e));
}
@inline
function sub2(a: v128, b: v128, c: v128, e: v128): v128 {
  return f64x2.sub(f64x2.mul(a, b), f64x2.mul(c, e));
}

function rotate(x: usize, d: i32, stride: i32, axis: i32, cos: f64, sin: f64): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  const run = usize(stride) * line;
  const c = f64x2.splat(cos); const s = f64x2.splat(sin);
  for (let block = x; block < x + io; block += 2 * run) {
    for (let p = block; p < block + run; p += 16) {
      const q = p + run;
      const a = at(p); const b = at(p + io); const e = at(q); const f = at(q + io);
      if (axis === 0) {
        v128.store(p, add2(c, a, s, f)); v128.store(p + io, sub2(c, b, s, e));
        v128.store(q, add2(c, e, s, b)); v128.store(q + io, sub2(c, f, s, a));
      } else if (axis === 1) {
        v128.store(p, sub2(c, a, s, e)); v128.store(p + io, sub2(c, b, s, f));
        v128.store(q, add2(c, e, s, a)); v128.store(q + io, add2(c, f, s, b));
      } else {
        v128.store(p, add2(c, a, s, b)); v128.store(p + io, sub2(c, b, s, a));
        v128.store(q, sub2(c, e, s, f)); v128.store(q + io, add2(c, f, s, e));
      }
    }
  }
}

function swap(x: usize, d: i32, control: i32, target: i32): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  const over = usize(target) * line;
  for (let row = 0; row < d; row++) {
    if ((row & control) === 0 || (row & target) !== 0) continue;
    const from = x + usize(row) * line;
    for (let p = from; p < from + line; p += 16) {
      let t = at(p);
      v128.store(p, at(p + over)); v128.store(p + over, t);
      t = at(p + io);
      v128.store(p + io, at(p + over + io)); v128.store(p + over + io, t);
    }
  }
}

function pair(x: usize, d: i32, m: usize, first: i32, second: i32): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  for (let row = 0; row < d; row++) {
    if ((row & (first | second)) !== 0) continue;
    const p0 = x + usize(row) * line;
    for (let p = p0; p < p0 + line; p += 16) {
      const q = p + usize(second) * line;
      const u = p + usize(first) * line;
      const v = u + usize(second) * line;
      const a0 = at(p); const b0 = at(p + io); const a1 = at(q); const b1 = at(q + io);
      const a2 = at(u); const b2 = at(u + io); const a3 = at(v); const b3 = at(v + io);
      for (let r: usize = 0; r < 4; r++) {
        const e = m + (r << 5);
        let re = f64x2.splat(0); let im = re;
        let mr = v128.load64_splat(e); let mi = v128.load64_splat(e, 128);
        re = minus(re, mr, a0, mi, b0); im = plus(im, mr, b0, mi, a0);
        mr = v128.load64_splat(e, 8); mi = v128.load64_splat(e, 136);
        re = minus(re, mr, a1, mi, b1); im = plus(im, mr, b1, mi, a1);
        mr = v128.load64_splat(e, 16); mi = v128.load64_splat(e, 144);
        re = minus(re, mr, a2, mi, b2); im = plus(im, mr, b2, mi, a2);
        mr = v128.load64_splat(e, 24); mi = v128.load64_splat(e, 152);
        re = minus(re, mr, a3, mi, b3); im = plus(im, mr, b3, mi, a3);
        const o = r === 0 ? p : r === 1 ? q : r === 2 ? u : v;
        v128.store(o, re); v128.store(o + io, im);
      }
    }
  }
}

/** One step on the rows of x. */
@inline
function advance(x: usize, d: i32, step: usize, matrices: usize, turns: usize): void {
  const kind = i32.load(step); const first = i32.load(step, 4);
  const third = i32.load(step, 12);
  if (kind < 3) {
    const turn = turns + (usize(third) << 4);
    rotate(x, d, first, kind, f64.load(turn), f64.load(turn, 8));
  } else if (kind === 3) swap(x, d, first, i32.load(step, 8));
  else pair(x, d, matrices + (usize(third) << 8), first, i32.load(step, 8));
}

/** x = 1. */
function reset(x: usize, d: i32): void {
  const size = usize(d * d) << 3;
  memory.fill(x, 0, 2 * size);
  for (let i: usize = 0; i < size; i += usize(d + 1) << 3) f64.store(x + i, 1.0);
}

/** The product of all steps. */
export function evolve(x: usize, d: i32, steps: usize, count: i32, matrices: usize, turns: usize): void {
  reset(x, d);
  const end = steps + (usize(count) << 4);
  for (let step = steps; step < end; step += 16) advance(x, d, step, matrices, turns);
}

/** Packed X^dag P X / 2 for a Pauli; `half` is room for the rows of its positive part. */
function pauli(out: usize, x: usize, half: usize, d: i32, stride: i32, axis: i32): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  const ih = io >> 1;
  const run = usize(stride) * line;
  let h = half;
  for (let block = x; block < x + io; block += 2 * run) {
    for (let p = block; p < block + run; p += 16) {
      const q = p + run;
      let re = at(p); let im = at(p + io);
      if (axis === 0) { re = f64x2.add(re, at(q)); im = f64x2.add(im, at(q + io)); }
      else if (axis === 1) { re = f64x2.add(re, at(q + io)); im = f64x2.sub(im, at(q)); }
      v128.store(h, re); v128.store(h + ih, im);
      h += 16;
    }
  }
  const f: f64 = axis === 2 ? 1.0 : 0.5;
  const g = f64x2.splat(f * 1.4142135623730951);
  for (let i: usize = 0; i < line; i += 16) {
    const row = out + i * usize(d);
    for (let j = i; j < line; j += 16) {
      let x0 = f64x2.splat(0); let y0 = x0; let x1 = x0; let y1 = x0;
      const end = half + ih;
      for (let r = half; r < end; r += line) {
        const cr = at(r + j); const ci = at(r + j + ih);
        let br = v128.load64_splat(r + i); let bi = v128.load64_splat(r + i + ih);
        x0 = plus(x0, br, cr, bi, ci); y0 = minus(y0, br, ci, bi, cr);
        br = v128.load64_splat(r + i, 8); bi = v128.load64_splat(r + i + ih, 8);
        x1 = plus(x1, br, cr, bi, ci); y1 = minus(y1, br, ci, bi, cr);
      }
      if (i === j) {
        f64.store(row + i, f * f64x2.extract_lane(x0, 0) - 0.5);
        f64.store(row + i, f64x2.extract_lane(f64x2.mul(g, x0), 1), 8);
        f64.store(row + line + i, f64x2.extract_lane(f64x2.mul(g, y0), 1));
        f64.store(row + line + i, f * f64x2.extract_lane(x1, 1) - 0.5, 8);
      } else {
        v128.store(row + j, f64x2.mul(g, x0)); v128.store(row + line + j, f64x2.mul(g, x1));
        y0 = f64x2.mul(g, y0); y1 = f64x2.mul(g, y1);
        const o = out + j * usize(d) + i;
        v128.store(o, i64x2.shuffle(y0, y1, 0, 2));
        v128.store(o + line, i64x2.shuffle(y0, y1, 1, 3));
      }
    }
  }
}

/** |U - e^{-i phi} V|^2 / 2; leaves the gap in w and cos, sin of -phi at `phase`. */
export function gap(w: usize, x: usize, target: usize, phase: usize, d: i32): f64 {
  const size = usize(d * d) << 3;
  let re = f64x2.splat(0); let im = re;
  for (let i: usize = 0; i < size; i += 16) {
    const u = at(target + i); const v = at(x + i);
    const ui = at(target + i + size); const vi = at(x + i + size);
    re = plus(re, u, v, ui, vi); im = minus(im, u, vi, ui, v);
  }
  const a = sum(re); const b = sum(im);
  const norm = Math.sqrt(a * a + b * b);
  const cos = norm === 0 ? 1.0 : a / norm; const sin = norm === 0 ? 0.0 : -b / norm;
  f64.store(phase, cos); f64.store(phase, sin, 8);
  const c = f64x2.splat(cos); const s = f64x2.splat(sin);
  let total = f64x2.splat(0);
  for (let i: usize = 0; i < size; i += 16) {
    const v = at(x + i); const vi = at(x + i + size);
    const p = f64x2.sub(at(target + i), sub2(c, v, s, vi));
    const q = f64x2.sub(at(target + i + size), add2(c, vi, s, v));
    v128.store(w + i, p); v128.store(w + i + size, q);
    total = plus(total, p, p, q, q);
  }
  return sum(total) / 2;
}

/** r = x^dag w. */
function product(r: usize, x: usize, w: usize, d: i32): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  for (let i: usize = 0; i < line; i += 16) {
    for (let j: usize = 0; j < line; j += 16) {
      let x0 = f64x2.splat(0); let y0 = x0; let x1 = x0; let y1 = x0;
      for (let k: usize = 0; k < io; k += line) {
        const cr = at(w + k + j); const ci = at(w + k + j + io);
        let br = v128.load64_splat(x + k + i); let bi = v128.load64_splat(x + k + i + io);
        x0 = plus(x0, br, cr, bi, ci); y0 = minus(y0, br, ci, bi, cr);
        br = v128.load64_splat(x + k + i, 8); bi = v128.load64_splat(x + k + i + io, 8);
        x1 = plus(x1, br, cr, bi, ci); y1 = minus(y1, br, ci, bi, cr);
      }
      const o = r + i * usize(d) + j;
      v128.store(o, x0); v128.store(o + io, y0);
      v128.store(o + line, x1); v128.store(o + line + io, y1);
    }
  }
}

/** s = (R^dag - R)/(2i) turned by the phase, Hermitian; as in the twin. s may be r. */
function tilt(r: usize, phase: usize, d: i32): void {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  const c = f64.load(phase); const s = -f64.load(phase, 8);
  for (let i: usize = 0; i < line; i += 8) {
    for (let j = i; j < line; j += 8) {
      const a = r + i * usize(d) + j;
      const b = r + j * usize(d) + i;
      const pr = f64.load(a); const pi = f64.load(a + io);
      const qr = f64.load(b); const qi = f64.load(b + io);
      const re = (c * pi + s * pr + (c * qi + s * qr)) / 2;
      const im = (c * qr - s * qi - (c * pr - s * pi)) / 2;
      f64.store(a, re); f64.store(b, re);
      f64.store(b + io, -im); f64.store(a + io, i === j ? 0.0 : im);
    }
  }
}

/** Packed P' / 2 of every angle in `rows`, of `line` doubles each; the product of all steps stays in x. */
export function jacobian(
  rows: usize, x: usize, half: usize, d: i32, line: i32,
  steps: usize, count: i32, matrices: usize, turns: usize,
): void {
  const end = steps + (usize(count) << 4);
  const row = usize(line) << 3;
  reset(x, d);
  for (let step = steps; step < end; step += 16) {
    advance(x, d, step, matrices, turns);
    const kind = i32.load(step);
    if (kind < 3) {
      pauli(rows + usize(i32.load(step, 12)) * row, x, half, d, i32.load(step, 4), kind);
    }
  }
}

/** F, its gradient and the lower triangle of the Gauss-Newton matrix; `rows` is p x d^2, `line` doubles a row. */
export function linearise(
  normal: usize, gradient: usize, rows: usize, work: usize, d: i32, p: i32, line: i32,
  steps: usize, count: i32, matrices: usize, turns: usize, target: usize,
): f64 {
  const size = usize(d * d) << 3;
  const x = work; const w = x + 2 * size; const r = w + 2 * size; const half = r + 2 * size; const phase = half + size;
  const row = usize(line) << 3;
  jacobian(rows, x, half, d, line, steps, count, matrices, turns);
  const value = gap(w, x, target, phase, d);
  product(r, x, w, d);
  tilt(r, phase, d);
  // packed like the rows, into w
  const n = usize(d) << 3;
  for (let i: usize = 0; i < n; i += 8) {
    const a = i * usize(d);
    f64.store(w + a + i, f64.load(r + a + i));
    for (let j = i + 8; j < n; j += 8) {
      f64.store(w + a + j, 1.4142135623730951 * f64.load(r + a + j));
      f64.store(w + j * usize(d) + i, 1.4142135623730951 * f64.load(r + a + j + size));
    }
  }
  for (let k = 0; k < p; k++) {
    const from = rows + usize(k) * row;
    let t = f64x2.splat(0);
    for (let i: usize = 0; i < size; i += 16) t = f64x2.add(t, f64x2.mul(at(from + i), at(w + i)));
    f64.store(gradient + (usize(k) << 3), sum(t));
  }
  gram(normal, rows, p, line);
  return value;
}

/** F and its gradient from two sweeps: A = X S goes along with X, and the entry is Tr(P A X^dag)/2. */
export function slope(
  gradient: usize, work: usize, d: i32,
  steps: usize, count: i32, matrices: usize, turns: usize, target: usize,
): f64 {
  const size = usize(d * d) << 3;
  const x = work; const w = x + 2 * size; const a = w + 2 * size; const phase = a + 3 * size;
  evolve(x, d, steps, count, matrices, turns);
  const value = gap(w, x, target, phase, d);
  product(a, x, w, d);
  tilt(a, phase, d);
  reset(x, d);
  const end = steps + (usize(count) << 4);
  for (let step = steps; step < end; step += 16) {
    advance(x, d, step, matrices, turns);
    advance(a, d, step, matrices, turns);
    const kind = i32.load(step);
    if (kind < 3) {
      f64.store(gradient + (usize(i32.load(step, 12)) << 3), overlap(x, a, d, i32.load(step, 4), kind) / 2);
    }
  }
  return value;
}

/** Re Tr(P A X^dag). */
function overlap(x: usize, a: usize, d: i32, stride: i32, axis: i32): f64 {
  const line = usize(d) << 3;
  const io = usize(d) * line;
  const run = usize(stride) * line;
  let s = f64x2.splat(0);
  for (let block: usize = 0; block < io; block += 2 * run) {
    for (let p = block; p < block + run; p += 16) {
      const q = p + run;
      const tr = at(x + p); const ti = at(x + p + io); const br = at(x + q); const bi = at(x + q + io);
      const er = at(a + p); const ei = at(a + p + io); const fr = at(a + q); const fi = at(a + q + io);
      if (axis === 0) {
        s = plus(s, er, br, ei, bi); s = plus(s, fr, tr, fi, ti);
      } else if (axis === 1) {
        s = minus(s, fi, tr, fr, ti); s = minus(s, er, bi, ei, br);
      } else {
        s = plus(s, er, tr, ei, ti); s = f64x2.sub(s, add2(fr, br, fi, bi));
      }
    }
  }
  return sum(s);
}
