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

/** Lower triangle of out = j j^T for p x m; three rows by three rows, m even. */
export function gram(out: usize, j: usize, p: i32, m: i32): void {
  const row: usize = usize(m) << 3;
  const line: usize = usize(p) << 3;
  for (let r = 0; r < p; r += 3) {
    const a0 = j + usize(r) * row;
    const a1 = j + usize(min(r + 1, p - 1)) * row;
    const a2 = j + usize(min(r + 2, p - 1)) * row;
    for (let s = 0; s <= r; s += 3) {
      const b0 = j + usize(s) * row;
      const b1 = j + usize(min(s + 1, p - 1)) * row;
      const b2 = j + usize(min(s + 2, p - 1)) * row;
      let c00 = f64x2.splat(0); let c01 = c00; let c02 = c00;
      let c10 = c00; let c11 = c00; let c12 = c00;
      let c20 = c00; let c21 = c00; let c22 = c00;
      for (let k: usize = 0; k < row; k += 16) {
        const x0 = at(a0 + k); const x1 = at(a1 + k); const x2 = at(a2 + k);
        let y = at(b0 + k);
        c00 = axpy(c00, x0, y); c10 = axpy(c10, x1, y); c20 = axpy(c20, x2, y);
        y = at(b1 + k);
        c01 = axpy(c01, x0, y); c11 = axpy(c11, x1, y); c21 = axpy(c21, x2, y);
        y = at(b2 + k);
        c02 = axpy(c02, x0, y); c12 = axpy(c12, x1, y); c22 = axpy(c22, x2, y);
      }
      const o = out + usize(r) * line + (usize(s) << 3);
      const t = p - s;
      put(o, c00, c01, c02, t);
      if (r + 1 < p) put(o + line, c10, c11, c12, t);
      if (r + 2 < p) put(o + 2 * line, c20, c21, c22, t);
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

/** Lower Cholesky factor l of a + diag(shift), p x p with `line` doubles a row (even); 0 when not positive definite. */
export function cholesky(l: usize, a: usize, shift: usize, p: i32, line: i32): i32 {
  const row = usize(line) << 3;
  for (let r = 0; r < p; r++) {
    const lr = l + usize(r) * row;
    const ar = a + usize(r) * row;
    for (let s = 0; s < r; s += 2) {
      const ls = l + usize(s) * row;
      const lt = ls + row;
      let x = f64x2.splat(0); let y = x;
      const end = usize(s) << 3;
      for (let k: usize = 0; k < end; k += 16) {
        const v = at(lr + k);
        x = axpy(x, v, at(ls + k));
        y = axpy(y, v, at(lt + k));
      }
      const first = (f64.load(ar + end) - sum(x)) / f64.load(ls + end);
      f64.store(lr + end, first);
      if (s + 1 < r) {
        const other = f64.load(ar + end, 8) - sum(y) - first * f64.load(lt + end);
        f64.store(lr + end, other / f64.load(lt + end, 8), 8);
      }
    }
    let x = f64x2.splat(0);
    const end = usize(r & ~1) << 3;
    for (let k: usize = 0; k < end; k += 16) { const v = at(lr + k); x = axpy(x, v, v); }
    let rest = f64.load(ar + (usize(r) << 3)) + f64.load(shift + (usize(r) << 3)) - sum(x);
    if (r & 1) { const v = f64.load(lr + end); rest -= v * v; }
    if (!(rest > 0)) return 0;
    f64.store(lr + (usize(r) << 3), Math.sqrt(rest));
  }
  return 1;
}
