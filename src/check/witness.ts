/**
 * Finds an input on which two different circuits can be told apart, and the measurement that shows it.
 *
 * Inputs tried: basis states, then product states of 0, 1, +, +i on the `any` inputs, all of them up to
 * `ALL_INPUTS_MAX`, and beyond those of a seeded sample whose outputs are furthest apart (products span all operators, so some
 * product input shows any difference). Measurements tried: the observed bits with the kept outputs in the Z basis; each kept output in the
 * X, Y and Z basis; parities of pairs of kept outputs; whole strings in random product bases.
 * Choice: the largest difference found, but a simpler measurement or input wins when it shows at least half of it.
 * Convention: inputs and outputs are named by the wires of the original: `q[0]=+i` means (|0> + i |1>)/sqrt2; `q[1]:X=1`
 * means outcome 1 of a measurement in the X basis, whose outcome 1 is |->; a bare bit string lists the bits.
 */
import { innerProduct, normSquared } from '../numeric/complex-matrix.ts';
import { random } from '../numeric/random.ts';
import type { Witness } from '../reports.ts';
import type { Observed } from './observed.ts';

const INPUTS_MAX = 1024;
/** Up to this many product inputs all of them are measured on. */
const ALL_INPUTS_MAX = 64;
/** Beyond, those that are furthest apart are. */
const MEASURED_INPUTS = 32;
const HALF = Math.SQRT1_2;
/** Whole strings in random bases are tried up to this many of them. */
const TURNED_ROWS_MAX = 2 ** 14;
/** Amplitudes of 0, 1, +, +i. */
const STATES = [
  [1, 0, 0, 0],
  [0, 0, 1, 0],
  [HALF, 0, HALF, 0],
  [HALF, 0, 0, HALF],
] as const;
const STATE_NAMES = ['0', '1', '+', '+i'];
const BASIS_NAMES = ['Z', 'X', 'Y'];

export type WitnessNames = {
  /** Names of the `any` inputs, of the kept outputs, and of the observed bits. */
  inputs: readonly string[];
  outputs: readonly string[];
  bits: readonly string[];
  /** True when some input is fixed to |0>. */
  hasZeroInputs: boolean;
};

type Candidate = Witness & { complexity: number };

export function findWitness(
  original: Observed,
  rewritten: Observed,
  names: WitnessNames,
  seed: number,
): Witness | null {
  let best: Candidate | null = null;
  const gapOf = (c: Candidate): number => Math.abs(c.probabilityOriginal - c.probabilityRewritten);
  const offer = (candidate: Candidate): void => {
    if (!best) best = candidate;
    else {
      const [mine, its] = [gapOf(candidate), gapOf(best)];
      const isSimpler = candidate.complexity < best.complexity;
      const isBetter = isSimpler ? mine >= its / 2 && mine > 0 : mine > 2 * its;
      if (isBetter || (candidate.complexity === best.complexity && mine > its)) best = candidate;
    }
  };
  for (const { input, a, b } of promising(original, rewritten, names.inputs.length, seed)) {
    const shown = inputText(names, input);
    const simple = input.filter((s) => s > 1).length;
    for (const { output, p, q, complexity } of measurements(a, b, names, seed)) {
      offer({
        input: shown,
        output,
        probabilityOriginal: p,
        probabilityRewritten: q,
        complexity: complexity + simple,
      });
    }
  }
  if (!best) return null;
  const { input, output, probabilityOriginal, probabilityRewritten } = best as Candidate;
  return { input, output, probabilityOriginal, probabilityRewritten };
}

type Tried = { input: readonly number[]; a: Ensemble; b: Ensemble };

/** The inputs whose outputs are furthest apart, some of them basis states; all of them where there are few. */
function promising(original: Observed, rewritten: Observed, n: number, seed: number): Tried[] {
  const inputs = productInputs(n, seed);
  const tried = inputs.map((input): Tried & { apart: number } => {
    const [a, b] = [outputStates(original, input), outputStates(rewritten, input)];
    return { input, a, b, apart: distanceOf(a, b) };
  });
  if (4 ** n <= ALL_INPUTS_MAX) return tried;
  const isBasis = ({ input }: Tried): boolean => input.every((state) => state < 2);
  const sorted = tried.sort((x, y) => y.apart - x.apart);
  return [
    ...sorted.filter(isBasis).slice(0, MEASURED_INPUTS / 2),
    ...sorted.filter((one) => !isBasis(one)).slice(0, MEASURED_INPUTS / 2),
  ];
}

function productInputs(n: number, seed: number): number[][] {
  if (4 ** n <= ALL_INPUTS_MAX) {
    return Array.from({ length: 4 ** n }, (_, k) =>
      Array.from({ length: n }, (_, w) => Math.floor(k / 4 ** (n - 1 - w)) % 4),
    );
  }
  const basis = Array.from({ length: Math.min(2 ** n, INPUTS_MAX / 2) }, (_, k) =>
    Array.from({ length: n }, (_, w) => (k >> (n - 1 - w)) & 1),
  );
  const draw = random(seed, 'witness');
  // each of these costs 4^n
  const products = Math.max(16, Math.min(INPUTS_MAX / 8, 2 ** 25 / 4 ** n));
  const drawn = Array.from({ length: products }, () =>
    Array.from({ length: n }, () => Math.floor(4 * draw())),
  );
  return [...basis, ...drawn];
}

/** Squared distance of two ensembles up to one phase; where their columns differ in number, that of their probabilities. */
function distanceOf(a: Ensemble, b: Ensemble): number {
  let [re, im, norms, apart] = [0, 0, 0, 0];
  for (const key of new Set([...a.keys(), ...b.keys()])) {
    const [x, y] = [a.get(key), b.get(key)];
    if (x && y && x.columns === y.columns) {
      const [p, q] = innerProduct(x.states, y.states);
      re += p;
      im += q;
      norms += normSquared(x.states) + normSquared(y.states);
    } else apart += Math.abs((x ? normSquared(x.states) : 0) - (y ? normSquared(y.states) : 0));
  }
  return apart + norms - 2 * Math.hypot(re, im);
}

function inputText({ inputs, hasZeroInputs }: WitnessNames, states: readonly number[]): string {
  if (inputs.length === 0) return 'all wires in |0>';
  const list = inputs.map((name, k) => `${name}=${STATE_NAMES[states[k]!]}`).join(' ');
  return hasZeroInputs ? `${list}, other wires in |0>` : list;
}

/** Per outcome of the bits: the unnormalised states (columns e) of the kept outputs, planar 2^k x columns. */
type Ensemble = Map<string, { states: Float64Array; columns: number }>;

function outputStates(observed: Observed, input: readonly number[]): Ensemble {
  const c = 2 ** input.length;
  const k = observed.rows / c;
  const [re, im] = [new Float64Array(c), new Float64Array(c)];
  const support: number[] = [];
  for (let state = 0; state < c; state++) {
    let [x, y] = [1, 0];
    input.forEach((s, w) => {
      const isOne = (state >> (input.length - 1 - w)) & 1;
      const [ar, ai] = [STATES[s]![2 * isOne]!, STATES[s]![2 * isOne + 1]!];
      [x, y] = [x * ar - y * ai, x * ai + y * ar];
    });
    re[state] = x;
    im[state] = y;
    if (x !== 0 || y !== 0) support.push(state);
  }
  const out: Ensemble = new Map();
  for (const [key, { matrix, columns }] of observed.outcomes) {
    const half = observed.rows * columns;
    const states = new Float64Array(2 * k * columns);
    for (let row = 0; row < k; row++) {
      for (const state of support) {
        const from = (row * c + state) * columns;
        for (let e = 0; e < columns; e++) {
          const [x, y] = [matrix[from + e]!, matrix[half + from + e]!];
          states[row * columns + e]! += x * re[state]! - y * im[state]!;
          states[k * columns + row * columns + e]! += x * im[state]! + y * re[state]!;
        }
      }
    }
    out.set(key, { states, columns });
  }
  return out;
}

type Shown = { output: string; p: number; q: number; complexity: number };

function* measurements(
  a: Ensemble,
  b: Ensemble,
  names: WitnessNames,
  seed: number,
): Generator<Shown> {
  const kept = names.outputs.length;
  const allZ = new Array<number>(kept).fill(0);
  yield* strings(a, b, names, allZ, 2);
  yield* singleOutputs(a, b, names);
  if (2 ** kept > TURNED_ROWS_MAX) return;
  const draw = random(seed, 'bases');
  for (let k = 0; k < Math.min(6, 3 ** kept - 1); k++) {
    yield* strings(
      a,
      b,
      names,
      allZ.map(() => Math.floor(3 * draw())),
      4,
    );
  }
}

/** The outcome string, bits and kept outputs together, whose probabilities differ most. */
function* strings(
  a: Ensemble,
  b: Ensemble,
  names: WitnessNames,
  bases: readonly number[],
  complexity: number,
): Generator<Shown> {
  let best: { key: string; row: number; p: number; q: number } | undefined;
  for (const key of new Set([...a.keys(), ...b.keys()])) {
    const [p, q] = [probabilities(a.get(key), bases), probabilities(b.get(key), bases)];
    for (let row = 0; row < 2 ** bases.length; row++) {
      const [x, y] = [p[row] ?? 0, q[row] ?? 0];
      if (best && Math.abs(x - y) <= Math.abs(best.p - best.q) + 1e-15) continue;
      best = { key, row, p: x, q: y };
    }
  }
  if (!best) return;
  const { key, row, p, q } = best;
  const parts = [
    ...names.bits.map((name, k) => `${name}=${key[k]}`),
    ...names.outputs.map(
      (name, k) => `${name}:${BASIS_NAMES[bases[k]!]}=${(row >> (bases.length - 1 - k)) & 1}`,
    ),
  ];
  yield { output: parts.join(' '), p, q, complexity };
}

/** Of every string of the kept outputs, measured in these bases. */
function probabilities(
  one: { states: Float64Array; columns: number } | undefined,
  bases: readonly number[],
): Float64Array {
  const n = bases.length;
  const out = new Float64Array(2 ** n);
  if (!one) return out;
  const { columns } = one;
  const turned = bases.some((basis) => basis > 0) ? one.states.slice() : one.states;
  bases.forEach((basis, wire) => {
    if (basis > 0) turnToBasis(turned, n, wire, basis, columns);
  });
  const half = turned.length / 2;
  for (let row = 0; row < out.length; row++) {
    for (let e = row * columns; e < (row + 1) * columns; e++) {
      out[row]! += turned[e]! ** 2 + turned[half + e]! ** 2;
    }
  }
  return out;
}

/** Multiplies one wire by H (X basis) or H S^dag (Y basis), so that Z outcomes are those of the basis. */
function turnToBasis(
  states: Float64Array,
  n: number,
  wire: number,
  basis: number,
  columns: number,
): void {
  const stride = 2 ** (n - 1 - wire);
  const im = states.length / 2;
  for (let row = 0; row < 2 ** n; row++) {
    if (row & stride) continue;
    for (let e = 0; e < columns; e++) {
      const [p, q] = [row * columns + e, (row + stride) * columns + e];
      const [ar, ai] = [states[p]!, states[im + p]!];
      const [x, y] = [states[q]!, states[im + q]!];
      // S^dag multiplies |1> by -i
      const [br, bi] = basis === 2 ? [y, -x] : [x, y];
      states[p] = HALF * (ar + br);
      states[im + p] = HALF * (ai + bi);
      states[q] = HALF * (ar - br);
      states[im + q] = HALF * (ai - bi);
    }
  }
}

/** Each kept output by itself in the Z, X and Y basis. */
function* singleOutputs(a: Ensemble, b: Ensemble, names: WitnessNames): Generator<Shown> {
  const n = names.outputs.length;
  for (const [wire, name] of names.outputs.entries()) {
    const [p, q] = [outcomesOfOne(a, n, wire), outcomesOfOne(b, n, wire)];
    for (const [basis, letter] of BASIS_NAMES.entries()) {
      yield { output: `${name}:${letter}=1`, p: p[basis]!, q: q[basis]!, complexity: 1 };
    }
  }
}

/** Probabilities of outcome 1 of one wire in the Z, X and Y basis: from the overlap of the halves with it in |0> and |1>. */
function outcomesOfOne(ensemble: Ensemble, n: number, wire: number): [number, number, number] {
  const stride = 2 ** (n - 1 - wire);
  let [zeros, ones, re, im] = [0, 0, 0, 0];
  for (const { states, columns } of ensemble.values()) {
    const half = states.length / 2;
    const run = stride * columns;
    for (let start = 0; start < half; start += 2 * run) {
      for (let p = start; p < start + run; p++) {
        const [ar, ai, br, bi] = [states[p]!, states[half + p]!, states[p + run]!, states[half + p + run]!]; // biome-ignore format: one list
        zeros += ar * ar + ai * ai;
        ones += br * br + bi * bi;
        re += ar * br + ai * bi;
        im += ar * bi - ai * br;
      }
    }
  }
  return [ones, (zeros + ones) / 2 - re, (zeros + ones) / 2 - im];
}
