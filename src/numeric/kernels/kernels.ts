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

type Exports = {
  memory: { buffer: ArrayBuffer; grow(pages: number): number };
  gram(out: number, j: number, p: number, m: number): void;
  multiply(out: number, a: number, b: number, m: number, k: number, n: number): void;
  square(out: number, b: number, rows: number, d: number): void;
  cholesky(l: number, a: number, shift: number, p: number, line: number): number;
};

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
    if (view.buffer !== wasm.memory.buffer) view = new Float64Array(wasm.memory.buffer);
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
      const line = m + (m % 2);
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
      const [o, q, s] = places(line * line, p * line, p) as [number, number, number];
      put(q, a, p, p, line);
      view.set(shift, s);
      if (wasm.cholesky(8 * o, 8 * q, 8 * s, p, line) === 0) return false;
      takeTriangle(l, o, p, line);
      return true;
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
