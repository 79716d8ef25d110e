/**
 * Finds an input on which two different circuits can be told apart, and the measurement that shows it.
 *
 * Inputs tried: basis states, then product states of 0, 1, +, +i on the `any` inputs, all of them up to
 * `INPUTS_MAX` and a seeded sample beyond (products span all operators, so some product input shows any
 * difference). Measurements tried: the observed bits with the kept outputs in the Z basis; each kept output in the
 * X, Y and Z basis; parities of pairs of kept outputs; whole strings in random product bases.
 * Choice: the largest difference found, but a simpler measurement or input wins when it shows at least half of it.
 * Convention: inputs and outputs are named by the wires of the original: `q[0]=+i` means (|0> + i |1>)/sqrt2; `q[1]:X=1`
 * means outcome 1 of a measurement in the X basis, whose outcome 1 is |->; a bare bit string lists the bits.
 */
import { random } from '../numeric/random.ts';
import type { Witness } from '../reports.ts';
import type { Observed } from './observed.ts';

const INPUTS_MAX = 1024;
const HALF = Math.SQRT1_2;
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
  for (const input of productInputs(names.inputs.length, seed)) {
    const a = outputStates(original, input);
    const b = outputStates(rewritten, input);
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

function* productInputs(n: number, seed: number): Generator<number[]> {
  const basis = 2 ** n;
  if (4 ** n <= INPUTS_MAX) {
    for (let k = 0; k < 4 ** n; k++) {
      yield Array.from({ length: n }, (_, w) => Math.floor(k / 4 ** (n - 1 - w)) % 4);
    }
    return;
  }
  for (let k = 0; k < Math.min(basis, INPUTS_MAX / 2); k++) {
    yield Array.from({ length: n }, (_, w) => (k >> (n - 1 - w)) & 1);
  }
  const draw = random(seed, 'witness');
  for (let k = 0; k < INPUTS_MAX / 8; k++) {
    yield Array.from({ length: n }, () => Math.floor(4 * draw()));
  }
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
  for (let state = 0; state < c; state++) {
    let [x, y] = [1, 0];
    input.forEach((s, w) => {
      const isOne = (state >> (input.length - 1 - w)) & 1;
      const [ar, ai] = [STATES[s]![2 * isOne]!, STATES[s]![2 * isOne + 1]!];
      [x, y] = [x * ar - y * ai, x * ai + y * ar];
    });
    re[state] = x;
    im[state] = y;
  }
  const out: Ensemble = new Map();
  for (const [key, { matrix, columns }] of observed.outcomes) {
    const half = observed.rows * columns;
    const states = new Float64Array(2 * k * columns);
    for (let row = 0; row < k; row++) {
      for (let state = 0; state < c; state++) {
        if (re[state] === 0 && im[state] === 0) continue;
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
  for (let wire = 0; wire < kept; wire++) {
    for (const basis of [0, 1, 2]) yield singleOutput(a, b, names, wire, basis);
  }
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
  const [p, q] = [distribution(a, bases), distribution(b, bases)];
  let best: { key: string; p: number; q: number } | undefined;
  for (const key of new Set([...p.keys(), ...q.keys()])) {
    const row = { key, p: p.get(key) ?? 0, q: q.get(key) ?? 0 };
    if (!best || Math.abs(row.p - row.q) > Math.abs(best.p - best.q) + 1e-15) best = row;
  }
  if (!best) return;
  const bitCount = names.bits.length;
  const parts = [
    ...names.bits.map((name, k) => `${name}=${best.key[k]}`),
    ...names.outputs.map(
      (name, k) => `${name}:${BASIS_NAMES[bases[k]!]}=${best.key[bitCount + k]}`,
    ),
  ];
  yield { output: parts.join(' '), p: best.p, q: best.q, complexity };
}

function distribution(ensemble: Ensemble, bases: readonly number[]): Map<string, number> {
  const out = new Map<string, number>();
  const n = bases.length;
  for (const [key, { states, columns }] of ensemble) {
    const turned = states.slice();
    bases.forEach((basis, wire) => {
      if (basis > 0) turnToBasis(turned, n, wire, basis, columns);
    });
    const half = turned.length / 2;
    for (let row = 0; row < 2 ** n; row++) {
      let p = 0;
      for (let e = row * columns; e < (row + 1) * columns; e++) {
        p += turned[e]! ** 2 + turned[half + e]! ** 2;
      }
      if (p > 0) out.set(key + (n > 0 ? row.toString(2).padStart(n, '0') : ''), p);
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

function singleOutput(
  a: Ensemble,
  b: Ensemble,
  names: WitnessNames,
  wire: number,
  basis: number,
): Shown {
  const bases = names.outputs.map((_, k) => (k === wire ? basis : 0));
  const at = names.bits.length + wire;
  const sumOf = (ensemble: Ensemble): number => {
    let sum = 0;
    for (const [key, p] of distribution(ensemble, bases)) if (key[at] === '1') sum += p;
    return sum;
  };
  const output = `${names.outputs[wire]}:${BASIS_NAMES[basis]}=1`;
  return { output, p: sumOf(a), q: sumOf(b), complexity: 1 };
}
