/**
 * The inner loops of the fits with 128-bit vectors of two doubles; the twin is ../plain.ts.
 *
 * Shape: arguments are byte addresses of planar row-major blocks. No relaxed instructions: the same bytes everywhere.
 * The order of every sum is that of the twin: vectors hold neighbouring columns, or the even and the odd terms of a sum.
 */

// @ts-nocheck: compiled by AssemblyScript
@inline
function at(p: usize): v128 { return v128.load(p); }
@inline
function sum(v: v128): f64 { return f64x2.extract_lane(v, 0) + f64x2.extract_lane(v, 1); }
@inline
function axpy(acc: v128, x: v128, y: v128): v128 { return f64x2.add(acc, f64x2.mul(x, y)); }

/** Rows of j that stay in the second-level cache while others pass by; a multiple of 3. */
const TILE: i32 = 24;

/** Lower triangle of out = j j^T for p x m; tiles of rows, in them three rows by three rows; m a multiple of 4. */
export function gram(out: usize, j: usize, p: i32, m: i32): void {
  for (let r = 0; r < p; r += TILE) {
    for (let s = 0; s <= r; s += TILE) tile(out, j, p, m, r, s);
  }
}

function tile(out: usize, j: usize, p: i32, m: i32, fromR: i32, fromS: i32): void {
  const row: usize = usize(m) << 3;
  const line: usize = usize(p) << 3;
  const endR = min(fromR + TILE, p);
  for (let r = fromR; r < endR; r += 3) {
    const a0 = j + usize(r) * row;
    const a1 = j + usize(min(r + 1, p - 1)) * row;
    const a2 = j + usize(min(r + 2, p - 1)) * row;
    const endS = min(fromS + TILE, r + 1);
    for (let s = fromS; s < endS; s += 3) {
      let x = a0; let y = a1; let z = a2;
      let u = j + usize(s) * row;
      let v = j + usize(min(s + 1, p - 1)) * row;
      let w = j + usize(min(s + 2, p - 1)) * row;
      const end = a0 + row;
      let c00 = f64x2.splat(0); let c01 = c00; let c02 = c00;
      let c10 = c00; let c11 = c00; let c12 = c00;
      let c20 = c00; let c21 = c00; let c22 = c00;
      for (; x < end; ) {
        let x0 = at(x); let x1 = at(y); let x2 = at(z);
        let t = at(u);
        c00 = axpy(c00, x0, t); c10 = axpy(c10, x1, t); c20 = axpy(c20, x2, t);
        t = at(v);
        c01 = axpy(c01, x0, t); c11 = axpy(c11, x1, t); c21 = axpy(c21, x2, t);
        t = at(w);
        c02 = axpy(c02, x0, t); c12 = axpy(c12, x1, t); c22 = axpy(c22, x2, t);
        x0 = v128.load(x, 16); x1 = v128.load(y, 16); x2 = v128.load(z, 16);
        t = v128.load(u, 16);
        c00 = axpy(c00, x0, t); c10 = axpy(c10, x1, t); c20 = axpy(c20, x2, t);
        t = v128.load(v, 16);
        c01 = axpy(c01, x0, t); c11 = axpy(c11, x1, t); c21 = axpy(c21, x2, t);
        t = v128.load(w, 16);
        c02 = axpy(c02, x0, t); c12 = axpy(c12, x1, t); c22 = axpy(c22, x2, t);
        x += 32; y += 32; z += 32; u += 32; v += 32; w += 32;
      }
      const o = out + usize(r) * line + (usize(s) << 3);
      const room = p - s;
      put(o, c00, c01, c02, room);
      if (r + 1 < p) put(o + line, c10, c11, c12, room);
      if (r + 2 < p) put(o + 2 * line, c20, c21, c22, room);
    }
  }
}

@inline
function put(o: usize, a: v128, b: v128, c: v128, room: i32): void {
  f64.store(o, sum(a));
  if (room > 1) f64.store(o, sum(b), 8);
  if (room > 2) f64.store(o, sum(c), 16);
}

/** out = a b for complex a of m x k, b of k x n, n even. */
export function multiply(out: usize, a: usize, b: usize, m: i32, k: i32, n: i32): void {
  const ia = usize(m * k) << 3;
  const ib = usize(k * n) << 3;
  const io = usize(m * n) << 3;
  const rowA = usize(k) << 3;
  const rowB = usize(n) << 3;
  for (let j: usize = 0; j < rowB; j += 16) {
    for (let i = 0; i < m; i += 2) {
      const second: bool = i + 1 < m;
      let p = a + usize(i) * rowA;
      const step = second ? rowA : 0;
      const end = p + rowA;
      let q = b + j;
      let x = f64x2.splat(0); let y = x; let u = x; let v = x;
      for (; p < end; p += 8) {
        const br = at(q); const bi = at(q + ib);
        let ar = v128.load64_splat(p); let ai = v128.load64_splat(p + ia);
        x = f64x2.add(x, f64x2.sub(f64x2.mul(ar, br), f64x2.mul(ai, bi)));
        y = f64x2.add(y, f64x2.add(f64x2.mul(ar, bi), f64x2.mul(ai, br)));
        ar = v128.load64_splat(p + step); ai = v128.load64_splat(p + step + ia);
        u = f64x2.add(u, f64x2.sub(f64x2.mul(ar, br), f64x2.mul(ai, bi)));
        v = f64x2.add(v, f64x2.add(f64x2.mul(ar, bi), f64x2.mul(ai, br)));
        q += rowB;
      }
      const o = out + usize(i) * rowB + j;
      v128.store(o, x); v128.store(o + io, y);
      if (second) { v128.store(o + rowB, u); v128.store(o + rowB + io, v); }
    }
  }
}

/** out = 2 b^dag b - 1 for complex b of rows x d, d even. */
export function square(out: usize, b: usize, rows: i32, d: i32): void {
  const line = usize(d) << 3;
  const ib = usize(rows) * line;
  const io = usize(d) * line;
  for (let i: usize = 0; i < line; i += 8) {
    const o = out + i * usize(d);
    for (let j: usize = i & ~15; j < line; j += 16) {
      let x = f64x2.splat(0); let y = x;
      for (let r: usize = 0; r < ib; r += line) {
        let br = v128.load64_splat(b + r + i); let bi = v128.load64_splat(b + r + i + ib);
        br = f64x2.add(br, br); bi = f64x2.add(bi, bi);
        const cr = at(b + r + j); const ci = at(b + r + j + ib);
        x = f64x2.add(x, f64x2.add(f64x2.mul(br, cr), f64x2.mul(bi, ci)));
        y = f64x2.add(y, f64x2.sub(f64x2.mul(br, ci), f64x2.mul(bi, cr)));
      }
      v128.store(o + j, x); v128.store(o + j + io, y);
    }
    f64.store(o + i, f64.load(o + i) - 1.0);
    f64.store(o + i + io, 0.0);
  }
  for (let i: usize = 0; i < line; i += 8) {
    for (let j: usize = i + 8; j < line; j += 8) {
      const from = out + i * usize(d) + j;
      const to = out + j * usize(d) + i;
      f64.store(to, f64.load(from));
      f64.store(to + io, -f64.load(from + io));
    }
  }
}

/** Rows of the factor that are worked on together; even. */
const GROUP: i32 = 24;
const SMALL_GROUP: i32 = 4;

/** Lower Cholesky factor l of a + diag(shift); l has `line` doubles a row (even), a has p; 0 when not positive definite. */
export function cholesky(l: usize, a: usize, shift: usize, p: i32, line: i32): i32 {
  const row = usize(line) << 3;
  const rowA = usize(p) << 3;
  const group = p > 4 * GROUP ? GROUP : SMALL_GROUP;
  for (let from = 0; from < p; from += group) {
    const to = min(from + group, p);
    for (let s = 0; s < from; s += 2) {
      let r = from;
      for (; r + 3 < to; r += 4) fourRows(l, a, row, rowA, r, s);
      for (; r < to; r++) entries(l, a, row, rowA, r, s);
    }
    for (let r = from; r < to; r++) {
      const lr = l + usize(r) * row;
      for (let s = from; s < r; s += 2) entries(l, a, row, rowA, r, s);
      let x = f64x2.splat(0);
      const end = usize(r & ~1) << 3;
      for (let k: usize = 0; k < end; k += 16) { const v = at(lr + k); x = axpy(x, v, v); }
      const here = usize(r) << 3;
      let rest = f64.load(a + usize(r) * rowA + here) + f64.load(shift + here) - sum(x);
      if (r & 1) { const v = f64.load(lr + end); rest -= v * v; }
      if (!(rest > 0)) return 0;
      f64.store(lr + here, Math.sqrt(rest));
    }
  }
  return 1;
}

/** Columns s and s + 1 of row r, as far as they lie below the diagonal. */
function entries(l: usize, a: usize, row: usize, rowA: usize, r: i32, s: i32): void {
  const lr = l + usize(r) * row;
  const ls = l + usize(s) * row;
  const lt = ls + row;
  let x = f64x2.splat(0); let y = x;
  const end = usize(s) << 3;
  for (let k: usize = 0; k < end; k += 16) {
    const v = at(lr + k);
    x = axpy(x, v, at(ls + k));
    y = axpy(y, v, at(lt + k));
  }
  close(lr, a + usize(r) * rowA, ls, lt, end, sum(x), sum(y), s + 1 < r);
}

@inline
function close(lr: usize, ar: usize, ls: usize, lt: usize, end: usize, x: f64, y: f64, both: bool): void {
  const first = (f64.load(ar + end) - x) / f64.load(ls + end);
  f64.store(lr + end, first);
  if (both) {
    const other = f64.load(ar + end, 8) - y - first * f64.load(lt + end);
    f64.store(lr + end, other / f64.load(lt + end, 8), 8);
  }
}

/** Columns s and s + 1 of the rows r to r + 3, all below the diagonal. */
function fourRows(l: usize, a: usize, row: usize, rowA: usize, r: i32, s: i32): void {
  const ls = l + usize(s) * row;
  const lt = ls + row;
  const l0 = l + usize(r) * row;
  const l1 = l0 + row; const l2 = l1 + row; const l3 = l2 + row;
  let x0 = f64x2.splat(0); let x1 = x0; let x2 = x0; let x3 = x0;
  let y0 = x0; let y1 = x0; let y2 = x0; let y3 = x0;
  const end = usize(s) << 3;
  for (let k: usize = 0; k < end; k += 16) {
    const u = at(ls + k); const v = at(lt + k);
    let t = at(l0 + k); x0 = axpy(x0, t, u); y0 = axpy(y0, t, v);
    t = at(l1 + k); x1 = axpy(x1, t, u); y1 = axpy(y1, t, v);
    t = at(l2 + k); x2 = axpy(x2, t, u); y2 = axpy(y2, t, v);
    t = at(l3 + k); x3 = axpy(x3, t, u); y3 = axpy(y3, t, v);
  }
  const a0 = a + usize(r) * rowA;
  close(l0, a0, ls, lt, end, sum(x0), sum(y0), true);
  close(l1, a0 + rowA, ls, lt, end, sum(x1), sum(y1), true);
  close(l2, a0 + 2 * rowA, ls, lt, end, sum(x2), sum(y2), true);
  close(l3, a0 + 3 * rowA, ls, lt, end, sum(x3), sum(y3), true);
}

/** Overwrites b with the solution of l l^T x = b; l and b have `line` doubles a row (even). */
export function solve(b: usize, l: usize, p: i32, line: i32): void {
  const row = usize(line) << 3;
  for (let r = 0; r < p; r++) {
    const lr = l + usize(r) * row;
    let x = f64x2.splat(0);
    const end = usize(r & ~1) << 3;
    for (let k: usize = 0; k < end; k += 16) x = axpy(x, at(lr + k), at(b + k));
    const here = usize(r) << 3;
    let rest = f64.load(b + here) - sum(x);
    if (r & 1) rest -= f64.load(lr + end) * f64.load(b + end);
    f64.store(b + here, rest / f64.load(lr + here));
  }
  for (let r = p - 1; r >= 0; r--) {
    const lr = l + usize(r) * row;
    const here = usize(r) << 3;
    const value = f64.load(b + here) / f64.load(lr + here);
    f64.store(b + here, value);
    const v = f64x2.splat(value);
    const end = usize(r & ~1) << 3;
    for (let k: usize = 0; k < end; k += 16) v128.store(b + k, f64x2.sub(at(b + k), f64x2.mul(v, at(lr + k))));
    if (r & 1) f64.store(b + end, f64.load(b + end) - value * f64.load(lr + end));
  }
}
