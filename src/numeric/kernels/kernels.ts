/**
 * Hands out the inner loops of the fits: compiled with SIMD where the engine has it, plain TypeScript elsewhere.
 *
 * Method: the compiled module (assembly/kernels.ts, embedded as base64 by `npm run kernels`) works on a memory of its own;
 * operands are copied in and results out, linear work beside the cubic work of every kernel here. Both twins add in the
 * same order, so results have the same bytes with and without SIMD, on every worker and machine.
 * Cost: as said in plain.ts; the memory grows to the largest call and is kept.
 * Fails: no WebAssembly, no SIMD or no memory: the twin takes over.
 */
import { KERNEL_MODULE } from './module.generated.ts';
import { type Kernels, plainKernels } from './plain.ts';
import type { Sweep } from './plain-sweep.ts';

type Exports = {
  memory: { buffer: ArrayBuffer; grow(pages: number): number };
  gram(out: number, j: number, p: number, m: number): void;
  multiply(out: number, a: number, b: number, m: number, k: number, n: number): void;
  square(out: number, b: number, rows: number, d: number): void;
  cholesky(l: number, a: number, shift: number, p: number, line: number): number;
  solve(b: number, l: number, p: number, line: number): void;
  evolve(x: number, d: number, ...chain: ChainPlaces): void;
  jacobian(
    rows: number,
    x: number,
    half: number,
    d: number,
    line: number,
    ...chain: ChainPlaces
  ): void;
  gap(w: number, x: number, target: number, phase: number, d: number): number;
  slope(gradient: number, work: number, d: number, ...rest: [...ChainPlaces, number]): number;
  linearise(
    normal: number,
    gradient: number,
    rows: number,
    work: number,
    d: number,
    p: number,
    line: number,
    ...rest: [...ChainPlaces, number]
  ): number;
};

/** Steps, their number, matrices, turns. */
type ChainPlaces = [number, number, number, number];

/** The part of WebAssembly used here; it is a global of every engine, not of the language. */
type Engine = {
  Module: new (bytes: Uint8Array) => object;
  Instance: new (module: object, imports: object) => { exports: Exports };
};

const PAGE_BYTES = 65_536;
/** The module keeps the bytes below this to itself. */
const BASE_BYTES = 1024;

/** The compiled kernels, or undefined where the engine cannot run them. */
export function simdKernels(): Kernels | undefined {
  const engine = (globalThis as unknown as { WebAssembly?: Engine }).WebAssembly;
  if (!engine) return undefined;
  try {
    const module = new engine.Module(bytesOf(KERNEL_MODULE));
    return wrap(new engine.Instance(module, {}).exports);
  } catch {
    return undefined;
  }
}

/** The kernels to use. */
export const kernels: Kernels = simdKernels() ?? plainKernels;

function wrap(wasm: Exports): Kernels {
  let view = new Float64Array(wasm.memory.buffer);
  let integers = new Int32Array(wasm.memory.buffer);
  /** Makes room for blocks of these many doubles; returns their places, each a multiple of 16 bytes. */
  const places = (...sizes: number[]): number[] => {
    let end = BASE_BYTES / 8;
    const found = sizes.map((size) => {
      const place = end;
      end += size + (size % 2);
      return place;
    });
    const missing = end * 8 - wasm.memory.buffer.byteLength;
    if (missing > 0) wasm.memory.grow(Math.ceil(missing / PAGE_BYTES));
    if (missing > 0) {
      view = new Float64Array(wasm.memory.buffer);
      integers = new Int32Array(wasm.memory.buffer);
    }
    return found;
  };
  /** Copies rows of `width` doubles to rows of `line` doubles. */
  const put = (to: number, from: Float64Array, rows: number, width: number, line: number): void => {
    if (width === line) {
      view.set(from.length === rows * width ? from : from.subarray(0, rows * width), to);
      return;
    }
    for (let r = 0; r < rows; r++) {
      view.set(from.subarray(r * width, (r + 1) * width), to + r * line);
      view.fill(0, to + r * line + width, to + (r + 1) * line);
    }
  };
  const take = (
    out: Float64Array,
    from: number,
    rows: number,
    width: number,
    line: number,
  ): void => {
    for (let r = 0; r < rows; r++) {
      const start = from + r * line;
      out.set(view.subarray(start, start + width), r * width);
    }
  };
  const takeTriangle = (out: Float64Array, from: number, p: number, line: number): void => {
    for (let r = 0; r < p; r++) {
      const start = from + r * line;
      out.set(view.subarray(start, start + r + 1), r * p);
    }
  };
  return {
    gramInto(out, j, p, m) {
      const line = 4 * Math.ceil(m / 4);
      const [o, a] = places(p * p, p * line) as [number, number];
      put(a, j, p, m, line);
      wasm.gram(8 * o, 8 * a, p, line);
      takeTriangle(out, o, p, p);
    },
    multiplyInto(out, a, b, m, k, n) {
      const line = n + (n % 2);
      const [o, p, q] = places(2 * m * line, 2 * m * k, 2 * k * line) as [number, number, number];
      put(p, a, 2 * m, k, k);
      put(q, b, 2 * k, n, line);
      wasm.multiply(8 * o, 8 * p, 8 * q, m, k, line);
      if (n === line) out.set(view.subarray(o, o + 2 * m * n));
      else take(out, o, 2 * m, n, line);
    },
    squareInto(out, b, rows, d) {
      if (d % 2 === 1) {
        plainKernels.squareInto(out, b, rows, d);
        return;
      }
      const [o, p] = places(2 * d * d, 2 * rows * d) as [number, number];
      put(p, b, 2 * rows, d, d);
      wasm.square(8 * o, 8 * p, rows, d);
      out.set(view.subarray(o, o + 2 * d * d));
    },
    choleskyInto(l, a, shift, p) {
      const line = p + (p % 2);
      const [o, q, s] = places(line * line, p * p, p) as [number, number, number];
      view.set(a, q);
      view.set(shift, s);
      if (wasm.cholesky(8 * o, 8 * q, 8 * s, p, line) === 0) return false;
      takeTriangle(l, o, p, line);
      return true;
    },
    solveInto(b, a, shift, p) {
      const line = p + (p % 2);
      const [o, q, s] = places(line * line, p * p, line) as [number, number, number];
      view.set(a, q);
      view.set(shift, s);
      if (wasm.cholesky(8 * o, 8 * q, 8 * s, p, line) === 0) return false;
      view.set(b, s);
      wasm.solve(8 * s, 8 * o, p, line);
      copyOut(b, view, s, p);
      return true;
    },
    ...sweeps(
      wasm,
      places,
      () => view,
      () => integers,
    ),
  };
}

/** out = the `count` doubles from `from` on; short runs one by one, which spares a view. */
function copyOut(out: Float64Array, view: Float64Array, from: number, count: number): void {
  if (count > 512) out.set(view.subarray(from, from + count));
  else for (let k = 0; k < count; k++) out[k] = view[from + k]!;
}

/** Spare doubles in the working memory of a sweep: its phase. */
const PHASE = 2;

function sweeps(
  wasm: Exports,
  places: (...sizes: number[]) => number[],
  memory: () => Float64Array,
  integers: () => Int32Array,
): Pick<Kernels, 'evolveInto' | 'rowsInto' | 'gapOf' | 'slopeInto' | 'lineariseInto'> {
  /** Copies a chain in; its arguments, and the places of blocks of these many doubles after it. */
  const load = (
    { steps, matrices }: Sweep,
    turns: Float64Array,
    ...sizes: number[]
  ): { chain: ChainPlaces; free: number[] } => {
    const held = steps.length / 2;
    const all = places(held, matrices.length, turns.length, ...sizes);
    const [s, m, t] = all as [number, number, number];
    const view = memory();
    integers().set(steps, 2 * s);
    view.set(matrices, m);
    view.set(turns, t);
    return { chain: [8 * s, steps.length / 4, 8 * m, 8 * t], free: all.slice(3) };
  };
  return {
    evolveInto(x, sweep, turns) {
      const size = 2 * sweep.d ** 2;
      const { chain, free } = load(sweep, turns, size);
      const [at] = free as [number];
      wasm.evolve(8 * at, sweep.d, ...chain);
      x.set(memory().subarray(at, at + size));
      return x;
    },
    rowsInto(rows, x, sweep, turns) {
      const size = sweep.d ** 2;
      const { chain, free } = load(sweep, turns, 2 * size, size, size * sweep.angles);
      const [at, half, first] = free as [number, number, number];
      wasm.jacobian(8 * first, 8 * at, 8 * half, sweep.d, size, ...chain);
      copyOut(x, memory(), at, 2 * size);
      copyOut(rows, memory(), first, size * sweep.angles);
      return x;
    },
    gapOf(sweep, turns, target) {
      const size = 2 * sweep.d ** 2;
      const { chain, free } = load(sweep, turns, size, size, size, PHASE);
      const [x, w, u, phase] = free as [number, number, number, number];
      memory().set(target, u);
      wasm.evolve(8 * x, sweep.d, ...chain);
      return wasm.gap(8 * w, 8 * x, 8 * u, 8 * phase, sweep.d);
    },
    slopeInto(gradient, sweep, turns, target) {
      const { d, angles } = sweep;
      const { chain, free } = load(sweep, turns, 2 * d * d, angles, 7 * d * d + PHASE);
      const [u, g, work] = free as [number, number, number];
      memory().set(target, u);
      const value = wasm.slope(8 * g, 8 * work, d, ...chain, 8 * u);
      copyOut(gradient, memory(), g, angles);
      return value;
    },
    lineariseInto(normal, gradient, sweep, turns, target) {
      const { d, angles: p } = sweep;
      const size = d * d;
      const sizes = [2 * size, p, 7 * size + PHASE, p * p, p * size];
      const { chain, free } = load(sweep, turns, ...sizes);
      const [u, g, work, n, rows] = free as [number, number, number, number, number];
      const view = memory();
      view.set(target, u);
      const addresses = [n, g, rows, work].map((place) => 8 * place);
      const [toN, toG, toRows, toWork] = addresses as [number, number, number, number];
      const value = wasm.linearise(toN, toG, toRows, toWork, d, p, size, ...chain, 8 * u);
      copyOut(gradient, view, g, p);
      copyOut(normal, view, n, p * p);
      return value;
    },
  };
}

/** Decodes base64 (RFC 4648, section 4). */
function bytesOf(text: string): Uint8Array {
  const alphabet = 'ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/';
  const end = text.indexOf('=') < 0 ? text.length : text.indexOf('=');
  const bytes = new Uint8Array(Math.floor((end * 3) / 4));
  let [bits, held, next] = [0, 0, 0];
  for (let k = 0; k < end; k++) {
    bits = ((bits << 6) | alphabet.indexOf(text[k]!)) & 0xffff;
    held += 6;
    if (held >= 8) {
      held -= 8;
      bytes[next++] = (bits >> held) & 0xff;
    }
  }
  return bytes;
}
