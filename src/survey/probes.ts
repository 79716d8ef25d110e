/**
 * Finds influence on circuits too large for a matrix, by following states.
 *
 * For input j, with random product states on the other wires, the circuit carries |0>_j to psi_0 and |1>_j to
 * psi_1.
 * From the 2 x 2 matrices r_ab = Tr_rest |psi_a><psi_b| on an output, the output's state for every state of j
 * follows: it is the same for all of them iff r_00 = r_11 and r_01 = 0.
 * Shape: tables as in influence.ts, [output * n + input]. `kept`: half the largest trace distance seen between
 * the output's states for two opposite states of j; a circuit without that influence is wrong by at least this
 * for one of the two. `measured`: the same for the probability of the bit.
 * A difference seen is certain. None seen means none with probability one, but is no proof.
 * Cost: 2 n evolutions of 2^n amplitudes for each probe. Limit: `PROBE_WIRES_MAX` wires.
 */
import type { Circuit, GateOperation } from '../circuit/circuit.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { type Control, freeRunning } from '../control.ts';
import { normal, random } from '../numeric/random.ts';

/** 22 wires: 128 MB for the two states of an input. */
export const PROBE_WIRES_MAX = 22;
/** Most amplitudes held at once, as long as it is enough for one input. */
const AMPLITUDES_MAX = 2 ** 21;
/** Differences below this are rounding. */
export const PROBE_FLOOR = 1e-9;

export type ProbeTables = { kept: Float64Array; measured: Float64Array; probes: number };

export type ProbeOptions = { seed?: number; probes?: number; control?: Control };

/** The circuit must consist of gates only (`unitaryPart`). */
export function probeTables(circuit: Circuit, options: ProbeOptions = {}): ProbeTables {
  const { seed = 1, probes = 2, control = freeRunning } = options;
  const n = circuit.wires;
  const kept = new Float64Array(n * n);
  const measured = new Float64Array(n * n);
  const gates = circuit.operations.filter((o): o is GateOperation => o.kind === 'gate');
  // several inputs at once, two columns each: long rows are faster
  const batch = Math.max(1, Math.min(n, Math.floor(AMPLITUDES_MAX / 2 ** (n + 1))));
  let done = 0;
  for (let probe = 0; probe < probes; probe++) {
    for (let first = 0; first < n; first += batch) {
      if (control.stopped()) return { kept, measured, probes: done };
      const inputs = Array.from({ length: Math.min(batch, n - first) }, (_, k) => first + k);
      const columns = 2 * inputs.length;
      const states = new Float64Array(2 ** (n + 1) * columns);
      inputs.forEach((input, k) => {
        const draw = (): (() => number) => random(seed, 'probe', probe, input);
        putProductState(states, columns, 2 * k, n, input, 0, draw());
        putProductState(states, columns, 2 * k + 1, n, input, 1, draw());
      });
      for (const operation of gates) applyGateInto(states, operation, n, columns);
      inputs.forEach((input, k) => {
        for (let output = 0; output < n; output++) {
          const change = changeAt(states, columns, 2 * k, n, output);
          const at = output * n + input;
          kept[at] = Math.max(kept[at]!, change.kept);
          measured[at] = Math.max(measured[at]!, change.measured);
        }
      });
      const share = (probe * n + first + inputs.length) / (probes * n);
      control.report({ stage: 'probing influence', done: share });
    }
    done++;
  }
  return { kept, measured, probes: done };
}

/** A basis state on one wire, random states on the others: the same for both values of the wire. */
function putProductState(
  out: Float64Array,
  columns: number,
  column: number,
  n: number,
  fixed: number,
  value: number,
  draw: () => number,
): void {
  const d = 2 ** n;
  const im = d * columns;
  out[column] = 1;
  for (let wire = 0; wire < n; wire++) {
    const x = [normal(draw), normal(draw), normal(draw), normal(draw)];
    const size = Math.hypot(...x);
    const [ar, ai, br, bi] = (
      wire === fixed ? [1 - value, 0, value, 0] : x.map((y) => y / size)
    ) as [number, number, number, number]; // four entries
    const s = 2 ** (n - 1 - wire);
    for (let k = 0; k < d; k += 2 * s) {
      const p = k * columns + column;
      const q = p + s * columns;
      const [re, imaginary] = [out[p]!, out[im + p]!];
      out[p] = re * ar - imaginary * ai;
      out[im + p] = re * ai + imaginary * ar;
      out[q] = re * br - imaginary * bi;
      out[im + q] = re * bi + imaginary * br;
    }
  }
}

/**
 * How much an output changes between opposite states of the input, from its two evolved basis states
 * (neighbouring columns).
 */
function changeAt(
  states: Float64Array,
  columns: number,
  column: number,
  n: number,
  output: number,
): { kept: number; measured: number } {
  const d = 2 ** n;
  const im = d * columns;
  const s = 2 ** (n - 1 - output);
  // Bloch vectors (x, y, z) of r_00 - r_11, and of r_01 (complex)
  const difference = new Float64Array(3);
  const cross = new Float64Array(6);
  for (let k = 0; k < d; k++) {
    if (k & s) continue;
    const p0 = k * columns + column;
    const p1 = p0 + s * columns;
    const [a0, a0i, a1, a1i] = [states[p0]!, states[im + p0]!, states[p1]!, states[im + p1]!];
    const b0 = states[p0 + 1]!;
    const b0i = states[im + p0 + 1]!;
    const b1 = states[p1 + 1]!;
    const b1i = states[im + p1 + 1]!;
    difference[0]! += 2 * (a0 * a1 + a0i * a1i - b0 * b1 - b0i * b1i);
    difference[1]! += 2 * (a0 * a1i - a0i * a1 - b0 * b1i + b0i * b1);
    difference[2]! += a0 * a0 + a0i * a0i - a1 * a1 - a1i * a1i;
    difference[2]! -= b0 * b0 + b0i * b0i - b1 * b1 - b1i * b1i;
    // Tr(P |a><b|) = <b|P|a>: conj(b0) a1 etc.
    const up = [b0 * a1 + b0i * a1i, b0 * a1i - b0i * a1];
    const down = [b1 * a0 + b1i * a0i, b1 * a0i - b1i * a0];
    cross[0]! += up[0]! + down[0]!;
    cross[1]! += up[1]! + down[1]!;
    cross[2]! += up[1]! - down[1]!;
    cross[3]! += down[0]! - up[0]!;
    cross[4]! += b0 * a0 + b0i * a0i - b1 * a1 - b1i * a1i;
    cross[5]! += b0 * a0i - b0i * a0 - b1 * a1i + b1i * a1;
  }
  // input Paulis: Z gives r_00 - r_11; X gives r_01 + r_10 = 2 Re; Y gives 2 Im, in each Bloch component
  const changes = [
    [...difference],
    [0, 2, 4].map((k) => 2 * cross[k]!),
    [1, 3, 5].map((k) => 2 * cross[k]!),
  ];
  let [kept, measured] = [0, 0];
  for (const bloch of changes) {
    // trace distance = half the length of the difference; the bound is half of that
    kept = Math.max(kept, Math.hypot(...bloch) / 4);
    measured = Math.max(measured, Math.abs(bloch[2]!) / 4);
  }
  return { kept, measured };
}
