/**
 * The objectives of the fits: how far a template is from its target, with gradient and Gauss-Newton matrix.
 *
 * Shape: n wires, d = 2^n, p angles; matrices planar. The normal matrix is p x p, lower triangle.
 * Method (Heisenberg frame): with V = G_N .. G_1 and a rotation exp(-i t P/2) after which the product is X,
 * dV/dt = V (-i/2) P', P' = X^dag P X, which is Hermitian and traceless. Then
 *   unitary: F = |U - e^{-i phi} V|^2 / 2 = d D; with W = e^{-i phi} U^dag V and S = (W^dag - W)/(2i), the gradient is
 *            Tr(P' S)/2 and the Gauss-Newton matrix Tr(P'_p P'_q)/4: d^2 real numbers per angle, and the global
 *            phase drops out because P' is traceless.
 *   columns: the same for the first c columns; the phase is projected out by hand.
 *   carry:   F = sum |V^dag P_w V - Q|^2 / 2 over the Paulis P_w given; the derivative of V^dag P_w V is
 *            (i/2) [P', V^dag P_w V].
 * P' itself needs half a product: P = 2 B^dag B - 1 with B the rows of X in the +1 eigenspace of P.
 * Distances: unitary and columns by the cancellation-free sum of squares; carry 3/(32 d) times the sum of squares, which
 * agrees to first order with D after the best unitary on the other wires.
 * Cost per linearisation: p d^3 for the P', p^2 d^2 / 2 for the matrix (multiply-adds).
 */
import { assert } from '../assert.ts';
import { gateTable } from '../circuit/gates.ts';
import { adjoint, mulInto } from '../numeric/complex-matrix.ts';
import { kernels } from '../numeric/kernels/kernels.ts';
import {
  applyPair,
  rotateRows,
  type Sweep,
  swapControlled,
} from '../numeric/kernels/plain-sweep.ts';
import type { NormalProblem } from '../optimise/levenberg-marquardt.ts';
import { angleCount, entanglerMatrix, type Template } from './template.ts';

export type FitTarget =
  | { kind: 'unitary'; matrix: Float64Array }
  /** The first `columns` columns only (2^n x columns): isometries, and states for 1. */
  | { kind: 'columns'; matrix: Float64Array; columns: number }
  /** V^dag P_wire V = matrix for each entry: equality up to a unitary on the other wires afterwards. */
  | { kind: 'carry'; pulled: readonly { matrix: Float64Array; pauli: 'X' | 'Z'; wire: number }[] };

type Compiled =
  | { kind: 'rotation'; axis: 0 | 1 | 2; stride: number; angle: number }
  | { kind: 'pair'; matrix: Float64Array; first: number; second: number; swap: boolean }
  | { kind: 'free'; name: string; first: number; second: number; angle: number };

const AXES = { x: 0, y: 1, z: 2 } as const;

/** Everything a fit needs of template and target, with its working memory allocated once. */
export class FitObjective implements NormalProblem {
  readonly size: number;
  private readonly d: number;
  private readonly steps: readonly Compiled[];
  private readonly target: FitTarget;
  private readonly x: Float64Array;
  private readonly w: Float64Array;
  private readonly half: Float64Array;
  private readonly hermitian: Float64Array;
  private readonly rows: Float64Array;
  private readonly residual: Float64Array;
  private readonly frozen: Uint8Array | undefined;
  /** The steps for the kernels; undefined where an entangler has an angle of its own. */
  private readonly sweep: Sweep | undefined;
  /** The target where the kernels do the whole work: a unitary, and steps they know. */
  private readonly direct: Float64Array | undefined;
  private readonly turns: Float64Array;
  /** P'/2 of every angle as the kernels pack it, where the rows are made of it here. */
  private readonly packed: Float64Array;

  constructor(template: Template, target: FitTarget, frozen?: Uint8Array) {
    const n = template.wires;
    const d = 2 ** n;
    this.d = d;
    this.size = angleCount(template);
    this.target = target;
    this.frozen = frozen;
    this.steps = compile(template);
    this.x = new Float64Array(2 * d * d);
    this.w = new Float64Array(2 * d * d);
    this.half = new Float64Array(d * d);
    this.hermitian = new Float64Array(2 * d * d);
    this.turns = new Float64Array(2 * this.size);
    this.sweep = sweepOf(this.steps, d, this.size);
    this.direct = target.kind === 'unitary' && this.sweep ? target.matrix : undefined;
    this.packed = new Float64Array(this.sweep && !this.direct ? this.size * d * d : 0);
    const width = this.residualWidth();
    this.rows = new Float64Array(this.direct ? 0 : this.size * width);
    this.residual = new Float64Array(width);
  }

  private residualWidth(): number {
    const { d, target } = this;
    if (target.kind === 'unitary') return d * d;
    if (target.kind === 'columns') return 2 * d * target.columns;
    return target.pulled.length * d * d;
  }

  /** The distance D that a value of F stands for. */
  distance(value: number): number {
    const { target, d } = this;
    if (target.kind === 'unitary') return value / d;
    if (target.kind === 'columns') return value / target.columns;
    // F = sum/2; D = 3/(32 d) * sum
    return (3 * value) / (16 * d);
  }

  /** The F that belongs to a distance D. */
  valueOf(distance: number): number {
    return distance / this.distance(1);
  }

  value(angles: Float64Array): number {
    if (this.sweep) {
      this.turn(angles);
      if (this.direct) return kernels.gapOf(this.sweep, this.turns, this.direct);
      kernels.evolveInto(this.x, this.sweep, this.turns);
    } else this.evolve(angles);
    return this.measure();
  }

  /** Cosines and sines of the half angles, for the kernels. */
  private turn(angles: Float64Array): void {
    for (let k = 0; k < this.size; k++) {
      const t = angles[k]! / 2;
      this.turns[2 * k] = Math.cos(t);
      this.turns[2 * k + 1] = Math.sin(t);
    }
  }

  linearise(angles: Float64Array, normal: Float64Array, gradient: Float64Array): number {
    if (this.sweep && this.direct) {
      this.turn(angles);
      const { sweep, turns, direct } = this;
      const found = kernels.lineariseInto(normal, gradient, sweep, turns, direct);
      this.freeze(gradient, normal);
      return found;
    }
    const value = this.differentiate(angles, gradient);
    kernels.gramInto(normal, this.rows, this.size, this.residual.length);
    return value;
  }

  /** Clears the entries of frozen angles. */
  private freeze(gradient: Float64Array, normal?: Float64Array): void {
    const { frozen, size } = this;
    if (!frozen) return;
    for (let k = 0; k < size; k++) {
      if (!frozen[k]) continue;
      gradient[k] = 0;
      normal?.fill(0, k * size, (k + 1) * size);
      for (let r = k; normal && r < size; r++) normal[r * size + k] = 0;
    }
  }

  valueAndGradient(angles: Float64Array, gradient: Float64Array): number {
    if (!this.sweep || !this.direct) return this.differentiate(angles, gradient);
    this.turn(angles);
    const value = kernels.slopeInto(gradient, this.sweep, this.turns, this.direct);
    this.freeze(gradient);
    return value;
  }

  /** F and its gradient; leaves the Jacobian behind in `rows`. */
  private differentiate(angles: Float64Array, gradient: Float64Array): number {
    const value = this.value(angles);
    const width = this.residual.length;
    // the residual is of V itself; the P' need V step by step
    const last = this.target.kind === 'carry' ? this.pulledNow() : undefined;
    if (this.sweep) {
      kernels.rowsInto(this.packed, this.x, this.sweep, this.turns);
      for (let angle = 0; angle < this.size; angle++) {
        unpackHermitian(this.hermitian, this.packed, angle * this.d * this.d, this.d);
        this.rowOf(angle, last);
      }
    } else {
      this.evolve(angles, (angle) => {
        this.rowOf(angle, last);
      });
    }
    if (this.frozen) {
      for (let k = 0; k < this.size; k++) {
        if (this.frozen[k]) this.rows.fill(0, k * width, (k + 1) * width);
      }
    }
    for (let k = 0; k < this.size; k++) {
      let sum = 0;
      const at = k * width;
      for (let i = 0; i < width; i++) sum += this.rows[at + i]! * this.residual[i]!;
      gradient[k] = sum;
    }
    return value;
  }

  /** V from the angles into x; after every step with an angle, `visit(index)` with the Pauli in `hermitian`. */
  private evolve(angles: Float64Array, visit?: (angle: number) => void): void {
    const { x, d } = this;
    x.fill(0);
    for (let i = 0; i < d; i++) x[i * d + i] = 1;
    for (const step of this.steps) {
      if (step.kind === 'rotation') {
        const t = angles[step.angle]! / 2;
        rotateRows(x, d, step.stride, step.axis, Math.cos(t), Math.sin(t));
        if (visit) {
          this.pauliOf(step.axis, step.stride);
          visit(step.angle);
        }
      } else if (step.kind === 'pair') {
        if (step.swap) swapControlled(x, d, step.first, step.second);
        else applyPair(x, d, step.matrix, step.first, step.second);
      } else {
        const matrix = entanglerMatrix({ name: step.name, angle: 'free' }, angles[step.angle]!);
        applyPair(x, d, matrix, step.first, step.second);
        if (visit) {
          this.generatorOf(step.name, angles[step.angle]!, step.first, step.second);
          visit(step.angle);
        }
      }
    }
  }

  /** hermitian = X^dag P X for a single-wire Pauli. */
  private pauliOf(axis: 0 | 1 | 2, stride: number): void {
    projectRows(this.half, this.x, this.d, stride, axis);
    kernels.squareInto(this.hermitian, this.half, this.d / 2, this.d);
  }

  /** hermitian = X^dag (2 G) X, made traceless, for an entangler with dE/da = -i G E. */
  private generatorOf(name: string, angle: number, first: number, second: number): void {
    const { d } = this;
    const [generator] = gateTable.get(name)?.generator?.([angle]) ?? [];
    assert(generator !== undefined, () => `no generator for the entangler ${name}`);
    const moved = this.x.slice();
    applyPair(moved, d, generator.map((g) => 2 * g), first, second); // biome-ignore format: short
    mulInto(this.hermitian, adjoint(this.x, d), moved, d, d, d);
    const trace = this.traceOfHermitian() / d;
    for (let i = 0; i < d; i++) this.hermitian[i * d + i]! -= trace;
  }

  private traceOfHermitian(): number {
    let sum = 0;
    for (let i = 0; i < this.d; i++) sum += this.hermitian[i * this.d + i]!;
    return sum;
  }

  /** F for V in x; fills `residual`. */
  private measure(): number {
    const { target } = this;
    if (target.kind === 'unitary') return this.measureUnitary(target.matrix);
    if (target.kind === 'columns') return this.measureColumns(target.matrix, target.columns);
    return this.measureCarry(target.pulled);
  }

  private measureUnitary(u: Float64Array): number {
    const { x: v, d, w, residual } = this;
    const half = d * d;
    const [c, s] = phaseOf(u, v);
    let sum = 0;
    for (let i = 0; i < half; i++) {
      const a = u[i]! - (c * v[i]! - s * v[half + i]!);
      const b = u[half + i]! - (c * v[half + i]! + s * v[i]!);
      // the gap itself keeps its digits when both are nearly equal
      w[i] = a;
      w[half + i] = b;
      sum += a * a + b * b;
    }
    // r = (W^dag - 1) anti-Hermitian part / i with W^dag = e^{i phi} V^dag U; V^dag (U - e^{-i phi} V) e^{i phi}
    const r = mulInto(this.hermitian, adjoint(v, d), w, d, d, d);
    const [ur, ui] = [c, -s];
    for (let i = 0; i < d; i++) {
      for (let j = i; j < d; j++) {
        const [pr, pi] = [r[i * d + j]!, r[half + i * d + j]!];
        const [qr, qi] = [r[j * d + i]!, r[half + j * d + i]!];
        const [fr, fi] = [ur * pr - ui * pi, ur * pi + ui * pr];
        const [gr, gi] = [ur * qr - ui * qi, ur * qi + ui * qr];
        // (R - R^dag)/(2i) at (i, j)
        const re = (fi + gi) / 2;
        const im = -(fr - gr) / 2;
        if (i === j) residual[i * d + i] = re;
        else {
          residual[i * d + j] = Math.SQRT2 * re;
          residual[j * d + i] = Math.SQRT2 * im;
        }
      }
    }
    return sum / 2;
  }

  private measureColumns(t: Float64Array, c: number): number {
    const { x: v, d, w, residual } = this;
    const half = d * d;
    const size = d * c;
    let [re, im] = [0, 0];
    for (let i = 0; i < d; i++) {
      for (let j = 0; j < c; j++) {
        const [a, b] = [t[i * c + j]!, t[size + i * c + j]!];
        const [p, q] = [v[i * d + j]!, v[half + i * d + j]!];
        re += a * p + b * q;
        im += a * q - b * p;
      }
    }
    const norm = Math.hypot(re, im) || 1;
    const [cos, sin] = [re / norm, -im / norm];
    let sum = 0;
    for (let i = 0; i < d; i++) {
      for (let j = 0; j < c; j++) {
        const [p, q] = [v[i * d + j]!, v[half + i * d + j]!];
        const a = t[i * c + j]! - (cos * p - sin * q);
        const b = t[size + i * c + j]! - (cos * q + sin * p);
        w[i * c + j] = a;
        w[size + i * c + j] = b;
        sum += a * a + b * b;
      }
    }
    // r = e^{i phi} V^dag (T - e^{-i phi} V E), d x c
    const r = mulInto(this.hermitian, adjoint(v, d), w.subarray(0, 2 * size), d, d, c);
    for (let k = 0; k < size; k++) {
      const [a, b] = [r[k]!, r[size + k]!];
      residual[k] = cos * a + sin * b;
      residual[size + k] = cos * b - sin * a;
    }
    // stored for J = -(i/2) P' E so that gradient = J . r has the sign of the unitary case
    projectPhase(residual, d, c);
    return sum / 2;
  }

  private pulledNow(): Float64Array[] {
    if (this.target.kind !== 'carry') return [];
    return this.target.pulled.map(({ pauli, wire }) => {
      this.pauliOf(pauli === 'X' ? 0 : 2, this.d >> (wire + 1));
      return this.hermitian.slice();
    });
  }

  private measureCarry(pulled: Extract<FitTarget, { kind: 'carry' }>['pulled']): number {
    const { d, residual, hermitian } = this;
    const width = d * d;
    let sum = 0;
    pulled.forEach(({ matrix, pauli, wire }, k) => {
      this.pauliOf(pauli === 'X' ? 0 : 2, d >> (wire + 1));
      for (let i = 0; i < 2 * width; i++) hermitian[i]! -= matrix[i]!;
      packHermitian(residual, k * width, hermitian, d, 1);
      for (let i = 0; i < width; i++) sum += residual[k * width + i]! ** 2;
    });
    return sum / 2;
  }

  /** Row of J for one angle, from P' in `hermitian`. */
  private rowOf(angle: number, last: readonly Float64Array[] | undefined): void {
    const { d, hermitian, rows, residual, target } = this;
    const at = angle * residual.length;
    if (target.kind === 'unitary') {
      packHermitian(rows, at, hermitian, d, 0.5);
      return;
    }
    if (target.kind === 'columns') {
      const c = target.columns;
      const size = d * c;
      // -J with J = d(e^{-i phi} V E) seen from V: (i/2) P' E
      for (let i = 0; i < d; i++) {
        for (let j = 0; j < c; j++) {
          rows[at + i * c + j] = -hermitian[d * d + i * d + j]! / 2;
          rows[at + size + i * c + j] = hermitian[i * d + j]! / 2;
        }
      }
      projectPhase(rows.subarray(at, at + 2 * size), d, c);
      return;
    }
    last?.forEach((q, k) => {
      // (i/2)(P' Q - Q P'): with M = P' Q, Q P' = M^dag; i (M - M^dag)/2 is Hermitian
      const m = mulInto(this.w, hermitian, q, d, d, d);
      packCommutator(rows, at + k * d * d, m, d);
    });
  }
}

function compile(template: Template): Compiled[] {
  const n = template.wires;
  let angle = 0;
  return template.steps.map((step): Compiled => {
    if (step.kind === 'rotation') {
      return {
        kind: 'rotation',
        axis: AXES[step.axis],
        stride: 2 ** (n - 1 - step.wire),
        angle: angle++,
      };
    }
    const [first, second] = step.wires.map((wire) => 2 ** (n - 1 - wire)) as [number, number];
    if (step.angle === 'free')
      return { kind: 'free', name: step.name, first, second, angle: angle++ };
    const matrix = entanglerMatrix(step);
    const swap = !step.matrix && (step.name === 'cx' || step.name === 'CX');
    return { kind: 'pair', matrix, first, second, swap };
  });
}

/** The steps as the kernels take them, or undefined when one has a matrix that changes. */
function sweepOf(steps: readonly Compiled[], d: number, angles: number): Sweep | undefined {
  const matrices: number[] = [];
  const flat: number[] = [];
  for (const step of steps) {
    if (step.kind === 'free') return undefined;
    if (step.kind === 'rotation') flat.push(step.axis, step.stride, 0, step.angle);
    else if (step.swap) flat.push(3, step.first, step.second, 0);
    else {
      flat.push(4, step.first, step.second, matrices.length / 32);
      matrices.push(...step.matrix);
    }
  }
  const table = Float64Array.from(matrices);
  return { d, angles, steps: Int32Array.from(flat), matrices: table };
}

/** cos and sin of -phi, phi = the phase of Tr(u^dag v). */
function phaseOf(u: Float64Array, v: Float64Array): [number, number] {
  const half = u.length / 2;
  let [re, im] = [0, 0];
  for (let i = 0; i < half; i++) {
    re += u[i]! * v[i]! + u[half + i]! * v[half + i]!;
    im += u[i]! * v[half + i]! - u[half + i]! * v[i]!;
  }
  const norm = Math.hypot(re, im);
  return norm === 0 ? [1, 0] : [re / norm, -im / norm];
}

/** Takes the part along i E (a change of the global phase) out of a real vector of a d x c complex matrix. */
function projectPhase(r: Float64Array, d: number, c: number): void {
  const size = d * c;
  let sum = 0;
  for (let j = 0; j < c; j++) sum += r[size + j * c + j]!;
  for (let j = 0; j < c; j++) r[size + j * c + j]! -= sum / c;
}

/** Hermitian h as d^2 real numbers whose dot product is the trace of the product, times `scale`. */
function packHermitian(
  out: Float64Array,
  at: number,
  h: Float64Array,
  d: number,
  scale: number,
): void {
  const im = d * d;
  const root = scale * Math.SQRT2;
  for (let i = 0; i < d; i++) {
    out[at + i * d + i] = scale * h[i * d + i]!;
    for (let j = i + 1; j < d; j++) {
      out[at + i * d + j] = root * h[i * d + j]!;
      out[at + j * d + i] = root * h[im + i * d + j]!;
    }
  }
}

/** The Hermitian matrix that `packHermitian` packed at scale 1/2. */
function unpackHermitian(h: Float64Array, packed: Float64Array, at: number, d: number): void {
  const im = d * d;
  for (let i = 0; i < d; i++) {
    h[i * d + i] = 2 * packed[at + i * d + i]!;
    h[im + i * d + i] = 0;
    for (let j = i + 1; j < d; j++) {
      const x = Math.SQRT2 * packed[at + i * d + j]!;
      const y = Math.SQRT2 * packed[at + j * d + i]!;
      h[i * d + j] = x;
      h[j * d + i] = x;
      h[im + i * d + j] = y;
      h[im + j * d + i] = -y;
    }
  }
}

/** The Hermitian matrix (i/2)(m - m^dag), packed. */
function packCommutator(out: Float64Array, at: number, m: Float64Array, d: number): void {
  const im = d * d;
  const root = Math.SQRT1_2;
  for (let i = 0; i < d; i++) {
    out[at + i * d + i] = -m[im + i * d + i]!;
    for (let j = i + 1; j < d; j++) {
      // (i/2)(m_ij - conj m_ji)
      out[at + i * d + j] = -root * (m[im + i * d + j]! + m[im + j * d + i]!);
      out[at + j * d + i] = root * (m[i * d + j]! - m[j * d + i]!);
    }
  }
}

/** The d/2 rows of the +1 eigenspace of a Pauli on the wire of this stride. */
function projectRows(
  out: Float64Array,
  x: Float64Array,
  d: number,
  stride: number,
  axis: 0 | 1 | 2,
): void {
  const im = d * d;
  const half = im / 2;
  const run = stride * d;
  const h = Math.SQRT1_2;
  let o = 0;
  for (let block = 0; block < im; block += 2 * run) {
    for (let p = block; p < block + run; p++, o++) {
      const q = p + run;
      if (axis === 2) {
        out[o] = x[p]!;
        out[half + o] = x[im + p]!;
      } else if (axis === 0) {
        out[o] = h * (x[p]! + x[q]!);
        out[half + o] = h * (x[im + p]! + x[im + q]!);
      } else {
        // <y+| = (<0| - i <1|)/sqrt2
        out[o] = h * (x[p]! + x[im + q]!);
        out[half + o] = h * (x[im + p]! - x[q]!);
      }
    }
  }
}
