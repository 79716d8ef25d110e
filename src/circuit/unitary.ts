/**
 * Applies gates to state vectors and matrices, and turns a circuit into its unitary.
 *
 * Shape: a block of columns is 2^n x c, planar, row-major: data[row c + column], imaginary parts after all
 * 2^n c real parts. c = 1 is a state vector, c = 2^n a whole matrix.
 * Convention: wire 0 is the most significant bit of the row index; `applyGateInto` multiplies from the left,
 * in place. Top-level phases (`globalPhase`) are included by `circuitUnitary`.
 * Method: rows are visited once per group of 2^k that a k-wire gate mixes; rows whose control bits do not
 * match are skipped; 1-wire, diagonal and permutation gates take shorter paths.
 * Cost: about 8 2^k flops per entry for a k-wire gate, 6 to 14 per entry for one wire.
 * Fails: `circuitUnitary` throws InputError `not-unitary` on measurement, reset or a condition, and
 * `too-large` above `DENSE_WIRES_MAX`.
 */
import { InputError } from '../input-error.ts';
import { mulInto } from '../numeric/complex-matrix.ts';
import { unitaryPower } from '../numeric/unitary-eigen.ts';
import type { Circuit, GateOperation } from './circuit.ts';
import { gateTable } from './gates.ts';

/** Largest circuit that is turned into a dense matrix: 2^(2n+4) bytes, 256 MiB at 12 wires. */
export const DENSE_WIRES_MAX = 12;

/** The matrix of the base gate with its power, without the extra controls: planar 2^k x 2^k. */
export function baseMatrix(operation: GateOperation): Float64Array {
  const { name, angles, power, matrix } = operation;
  const k = operation.wires.length - operation.controls.length;
  const entry = gateTable.get(name);
  const base = matrix ?? entry?.matrix(angles);
  if (!base) throw new InputError({ code: 'unknown-gate', message: `unknown gate: ${name}` });
  if (power === 1) return base;
  const d = 2 ** k;
  if (!Number.isInteger(power)) return unitaryPower(base, d, power);
  return integerPower(power < 0 ? inverseOf(base, d) : base, d, Math.abs(power));
}

/** The matrix of the whole operation, controls included: planar 2^k x 2^k, k = number of operands. */
export function gateMatrix(operation: GateOperation): Float64Array {
  const n = operation.wires.length;
  const out = new Float64Array(2 * 4 ** n);
  const d = 2 ** n;
  for (let i = 0; i < d; i++) out[i * d + i] = 1;
  const local = { ...operation, wires: operation.wires.map((_, k) => k) };
  applyGateInto(out, local, n, d);
  return out;
}

function inverseOf(u: Float64Array, d: number): Float64Array {
  const out = new Float64Array(u.length);
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < d; j++) {
      out[j * d + i] = u[i * d + j]!;
      out[d * d + j * d + i] = -u[d * d + i * d + j]!;
    }
  }
  return out;
}

function integerPower(u: Float64Array, d: number, exponent: number): Float64Array {
  let result: Float64Array = new Float64Array(u.length);
  for (let i = 0; i < d; i++) result[i * d + i] = 1;
  let square = u;
  for (let e = exponent; e >= 1; e = Math.floor(e / 2)) {
    if (e % 2 >= 1) result = mulInto(new Float64Array(u.length), square, result, d, d, d);
    square = mulInto(new Float64Array(u.length), square, square, d, d, d);
  }
  return result;
}

/** Multiplies `data` (2^n x columns, planar) by the gate from the left, in place; returns it. */
export function applyGateInto(
  data: Float64Array,
  operation: GateOperation,
  n: number,
  columns: number,
): Float64Array {
  const controlCount = operation.controls.length;
  let mask = 0;
  let value = 0;
  for (let c = 0; c < controlCount; c++) {
    const bit = 2 ** (n - 1 - operation.wires[c]!);
    mask += bit;
    if (operation.controls[c]) value += bit;
  }
  const targets = controlCount === 0 ? operation.wires : operation.wires.slice(controlCount);
  return applyMatrixInto(data, baseMatrix(operation), targets, n, columns, mask, value);
}

/**
 * Multiplies `data` by a 2^k x 2^k matrix on the given wires (first = most significant), in place, on the
 * rows whose index r satisfies (r & mask) = value. The mask must not touch the wires. n <= 30.
 */
export function applyMatrixInto(
  data: Float64Array,
  matrix: Float64Array,
  wires: readonly number[],
  n: number,
  columns: number,
  mask = 0,
  value = 0,
): Float64Array {
  const inner = withoutFirstControl(matrix, wires.length);
  if (inner) {
    const stride = 2 ** (n - 1 - wires[0]!);
    return applyMatrixInto(data, inner, wires.slice(1), n, columns, mask + stride, value + stride);
  }
  const k = wires.length;
  const size = 2 ** k;
  const rows = 2 ** n;
  const im = rows * columns;
  const strides = wires.map((w) => 2 ** (n - 1 - w));
  const stridesAll = strides.reduce((sum, s) => sum + s, 0);
  // offset of each of the 2^k rows of a group from the group's first row
  const offsets = new Int32Array(size);
  for (let r = 0; r < size; r++) {
    for (let b = 0; b < k; b++) if (r & (1 << (k - 1 - b))) offsets[r]! += strides[b]!;
  }
  if (k === 1) {
    return applyOneWire(data, matrix, strides[0]!, rows, columns, mask, value);
  }
  const shape = rowShape(matrix, size);
  if (shape) {
    return applyMonomial(data, shape, offsets, stridesAll, rows, columns, mask, value);
  }
  const re = new Float64Array(size * columns);
  const imag = new Float64Array(size * columns);
  for (let row = 0; row < rows; row++) {
    if ((row & stridesAll) !== 0 || (row & mask) !== value) continue;
    for (let r = 0; r < size; r++) {
      const from = (row + offsets[r]!) * columns;
      for (let c = 0; c < columns; c++) {
        re[r * columns + c] = data[from + c]!;
        imag[r * columns + c] = data[im + from + c]!;
      }
    }
    for (let r = 0; r < size; r++) {
      const to = (row + offsets[r]!) * columns;
      data.fill(0, to, to + columns);
      data.fill(0, im + to, im + to + columns);
      for (let s = 0; s < size; s++) {
        const x = matrix[r * size + s]!;
        const y = matrix[size * size + r * size + s]!;
        if (x === 0 && y === 0) continue;
        const from = s * columns;
        for (let c = 0; c < columns; c++) {
          const a = re[from + c]!;
          const b = imag[from + c]!;
          data[to + c]! += x * a - y * b;
          data[im + to + c]! += x * b + y * a;
        }
      }
    }
  }
  return data;
}

/** The lower right block of a matrix whose first wire is a mere control; undefined for all others. */
function withoutFirstControl(matrix: Float64Array, k: number): Float64Array | undefined {
  if (k < 2) return undefined;
  const size = 2 ** k;
  const half = size / 2;
  for (let r = 0; r < half; r++) {
    for (let s = 0; s < size; s++) {
      const wanted = r === s ? 1 : 0;
      if (matrix[r * size + s] !== wanted || matrix[size * size + r * size + s] !== 0)
        return undefined;
      if (s >= half) continue;
      const below = (half + r) * size + s;
      if (matrix[below] !== 0 || matrix[size * size + below] !== 0) return undefined;
    }
  }
  const out = new Float64Array(2 * half * half);
  for (let r = 0; r < half; r++) {
    for (let s = 0; s < half; s++) {
      const from = (half + r) * size + half + s;
      out[r * half + s] = matrix[from]!;
      out[half * half + r * half + s] = matrix[size * size + from]!;
    }
  }
  return out;
}

function applyOneWire(
  data: Float64Array,
  m: Float64Array,
  stride: number,
  rows: number,
  columns: number,
  mask: number,
  value: number,
): Float64Array {
  const im = rows * columns;
  const [ar, br, cr, dr, ai, bi, ci, di] = m as unknown as number[] as [
    number, number, number, number, number, number, number, number,
  ]; // biome-ignore format: eight entries of one matrix
  const isDiagonal = br === 0 && bi === 0 && cr === 0 && ci === 0;
  const isFlip = ar === 0 && ai === 0 && dr === 0 && di === 0 && br === 1 && bi === 0 && cr === 1 && ci === 0; // biome-ignore format: one condition
  const upperIsOne = isDiagonal && ar === 1 && ai === 0;
  // rows that differ only below the lowest bit of wire and controls lie together: one run
  const lowest = mask === 0 ? stride : Math.min(stride, mask & -mask);
  const run = lowest * columns;
  const other = stride * columns;
  for (let row = 0; row < rows; row += lowest) {
    if ((row & stride) !== 0 || (row & mask) !== value) continue;
    const start = row * columns;
    if (isDiagonal) {
      if (!upperIsOne) scaleRow(data, start, im, run, ar, ai);
      scaleRow(data, start + other, im, run, dr, di);
      continue;
    }
    const end = start + run;
    if (isFlip) {
      for (let p = start; p < end; p++) {
        const q = p + other;
        const x = data[p]!;
        const y = data[im + p]!;
        data[p] = data[q]!;
        data[im + p] = data[im + q]!;
        data[q] = x;
        data[im + q] = y;
      }
      continue;
    }
    for (let p = start; p < end; p++) {
      const q = p + other;
      const xr = data[p]!;
      const xi = data[im + p]!;
      const yr = data[q]!;
      const yi = data[im + q]!;
      data[p] = ar * xr - ai * xi + br * yr - bi * yi;
      data[im + p] = ar * xi + ai * xr + br * yi + bi * yr;
      data[q] = cr * xr - ci * xi + dr * yr - di * yi;
      data[im + q] = cr * xi + ci * xr + dr * yi + di * yr;
    }
  }
  return data;
}

function scaleRow(
  data: Float64Array,
  at: number,
  im: number,
  columns: number,
  x: number,
  y: number,
): void {
  for (let c = at; c < at + columns; c++) {
    const a = data[c]!;
    const b = data[im + c]!;
    data[c] = x * a - y * b;
    data[im + c] = x * b + y * a;
  }
}

type Monomial = { source: Int32Array; re: Float64Array; im: Float64Array };

/** For a matrix with one non-zero entry per row: which column it is in, and its value. */
function rowShape(matrix: Float64Array, size: number): Monomial | undefined {
  const source = new Int32Array(size).fill(-1);
  const re = new Float64Array(size);
  const im = new Float64Array(size);
  for (let r = 0; r < size; r++) {
    for (let s = 0; s < size; s++) {
      const x = matrix[r * size + s]!;
      const y = matrix[size * size + r * size + s]!;
      if (x === 0 && y === 0) continue;
      if (source[r] !== -1) return undefined;
      source[r] = s;
      re[r] = x;
      im[r] = y;
    }
    if (source[r] === -1) return undefined;
  }
  return { source, re, im };
}

function applyMonomial(
  data: Float64Array,
  shape: Monomial,
  offsets: Int32Array,
  stridesAll: number,
  rows: number,
  columns: number,
  mask: number,
  value: number,
): Float64Array {
  const size = offsets.length;
  const im = rows * columns;
  const isPlainFixedRow = (r: number): boolean =>
    shape.source[r] === r && shape.re[r] === 1 && shape.im[r] === 0;
  const moved = Array.from({ length: size }, (_, r) => r).filter((r) => !isPlainFixedRow(r));
  const re = new Float64Array(moved.length * columns);
  const imag = new Float64Array(moved.length * columns);
  for (let row = 0; row < rows; row++) {
    if ((row & stridesAll) !== 0 || (row & mask) !== value) continue;
    moved.forEach((r, k) => {
      const from = (row + offsets[shape.source[r]!]!) * columns;
      const x = shape.re[r]!;
      const y = shape.im[r]!;
      for (let c = 0; c < columns; c++) {
        const a = data[from + c]!;
        const b = data[im + from + c]!;
        re[k * columns + c] = x * a - y * b;
        imag[k * columns + c] = x * b + y * a;
      }
    });
    moved.forEach((r, k) => {
      const to = (row + offsets[r]!) * columns;
      for (let c = 0; c < columns; c++) {
        data[to + c] = re[k * columns + c]!;
        data[im + to + c] = imag[k * columns + c]!;
      }
    });
  }
  return data;
}

/** The unitary of a circuit without measurement, reset or condition: planar 2^n x 2^n. */
export function circuitUnitary(circuit: Circuit): Float64Array {
  const { wires: n, operations, globalPhase, name } = circuit;
  if (n > DENSE_WIRES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `a dense matrix of ${n} wires needs 4^${n} x 16 bytes; ${DENSE_WIRES_MAX} wires is the limit here`,
      file: name,
    });
  }
  const d = 2 ** n;
  const out = new Float64Array(2 * d * d);
  for (let i = 0; i < d; i++) {
    out[i * d + i] = Math.cos(globalPhase);
    out[d * d + i * d + i] = Math.sin(globalPhase);
  }
  for (const operation of operations) {
    if (operation.kind === 'barrier') continue;
    if (operation.kind !== 'gate' || operation.condition) {
      const what = operation.condition ? 'a condition' : operation.kind;
      const { line, column } = operation;
      throw new InputError({
        code: 'not-unitary',
        message: `expected unitary gates only, got ${what}`,
        file: name,
        ...(line === undefined ? {} : { line }),
        ...(column === undefined ? {} : { column }),
      });
    }
    applyGateInto(out, operation, n, d);
  }
  return out;
}

/** u with its wires in another order: wire order[k] of u becomes wire k. */
export function withWireOrder(u: Float64Array, order: readonly number[]): Float64Array {
  const n = order.length;
  const d = 2 ** n;
  const from = Int32Array.from({ length: d }, (_, state) =>
    order.reduce((sum, wire, k) => sum + ((state >> (n - 1 - k)) & 1) * 2 ** (n - 1 - wire), 0),
  );
  const out = new Float64Array(u.length);
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < d; j++) {
      const at = from[i]! * d + from[j]!;
      out[i * d + j] = u[at]!;
      out[d * d + i * d + j] = u[d * d + at]!;
    }
  }
  return out;
}
