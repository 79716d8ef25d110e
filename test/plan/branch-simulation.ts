/**
 * Simulates a circuit branch by branch: every measurement splits the state in two, so conditions, resets and
 * wires used again mean what they say. An independent road for tests: it shares only the matrices of gates
 * with src.
 *
 * Result: for each value of the observed bits, the (unnormalised) density matrix of the kept outputs.
 */
import { type BitExpression, type Circuit, evaluateBits, gate } from '../../src/circuit/circuit.ts';
import { gateMatrix } from '../../src/circuit/unitary.ts';
import type { Contract } from '../../src/contract.ts';
import { normal, random } from '../../src/numeric/random.ts';

const SWAP = gateMatrix(gate('swap', [0, 1]));

type Qubit = readonly [number, number, number, number]; // re0, im0, re1, im1
type Branch = { re: Float64Array; im: Float64Array; axes: number; bits: boolean[] };
export type Outcomes = Map<string, { re: Float64Array; im: Float64Array }>;

/** A random pure state for every `any` input, |0> for the others. */
export function randomInputs(contract: Contract, seed: number): Qubit[] {
  const draw = random('inputs', seed);
  return contract.inputs.map((rule) => {
    if (rule === 'zero') return [1, 0, 0, 0];
    const x = [normal(draw), normal(draw), normal(draw), normal(draw)];
    const size = Math.hypot(...x);
    return x.map((y) => y / size) as unknown as Qubit;
  });
}

export function simulate(
  circuit: Circuit,
  inputs: readonly Qubit[],
  contract: Contract,
  bitNames: number,
): Outcomes {
  const annotated = circuit.operations.some(({ annotations }) =>
    annotations?.some((line) => line.startsWith('wiregauge.')),
  );
  let branches: Branch[] = [
    {
      re: Float64Array.of(1),
      im: Float64Array.of(0),
      axes: 0,
      bits: new Array(circuit.bits).fill(false),
    },
  ];
  const axisOf = new Map<number, number>();
  const keptAxis = new Map<number, number>();
  const start = (wire: number, qubit: Qubit): void => {
    branches = branches.map((b) => withQubit(b, qubit));
    axisOf.set(wire, branches[0]!.axes - 1);
  };
  if (!annotated) for (let w = 0; w < circuit.wires; w++) start(w, inputs[w]!);
  const note = (lines: readonly string[] | undefined, word: string): number => {
    for (const line of lines ?? []) {
      const [name, number] = line.split(' ');
      if (name === `wiregauge.${word}`) return Number(number);
    }
    return -1;
  };
  for (const operation of circuit.operations) {
    const { condition } = operation;
    const holds = (b: Branch, e: BitExpression | undefined): boolean =>
      e === undefined || evaluateBits(e, (bit) => b.bits[bit]!);
    if (operation.kind === 'reset') {
      if (condition) {
        // every branch gets a fresh axis; where the condition holds it is exchanged with the wire's
        const [axis, fresh] = [axisOf.get(operation.wire)!, branches[0]!.axes];
        branches = branches
          .map((b) => withQubit(b, [1, 0, 0, 0]))
          .map((b) => (holds(b, condition) ? applied(b, SWAP, [axis, fresh]) : b));
        continue;
      }
      const input = note(operation.annotations, 'enters');
      start(operation.wire, input >= 0 ? inputs[input]! : [1, 0, 0, 0]);
    } else if (operation.kind === 'gate') {
      const m = gateMatrix(operation);
      const axes = operation.wires.map((w) => axisOf.get(w)!);
      branches = branches.map((b) => (holds(b, condition) ? applied(b, m, axes) : b));
    } else if (operation.kind === 'measure') {
      const output = note(operation.annotations, 'leaves');
      if (output >= 0 && contract.outputs[output] === 'kept') {
        keptAxis.set(output, axisOf.get(operation.wire)!);
        continue;
      }
      branches = branches.flatMap((b) =>
        holds(b, condition)
          ? [false, true].map((value) =>
              projected(b, axisOf.get(operation.wire)!, value, operation.bit),
            )
          : [b],
      );
      branches = branches.filter(({ re, im }) => re.some((x, k) => x ** 2 + im[k]! ** 2 > 1e-30));
    } else if (operation.kind === 'assign') {
      branches = branches.map((b) => {
        if (!holds(b, condition)) return b;
        const bits = b.bits.slice();
        bits[operation.bit] = holds(b, operation.value);
        return { ...b, bits };
      });
    }
  }
  contract.outputs.forEach((rule, w) => {
    if (!annotated && rule === 'kept') keptAxis.set(w, axisOf.get(w)!);
  });
  const kept = contract.outputs.flatMap((rule, w) => (rule === 'kept' ? [keptAxis.get(w)!] : []));
  const out: Outcomes = new Map();
  for (const b of branches)
    addDensity(out, b, kept, b.bits.slice(0, bitNames).map(Number).join(''));
  return out;
}

/** Largest difference between two results. */
export function outcomeGap(a: Outcomes, b: Outcomes): number {
  let worst = 0;
  for (const key of new Set([...a.keys(), ...b.keys()])) {
    const [x, y] = [a.get(key), b.get(key)];
    const size = (x ?? y)!.re.length;
    for (let k = 0; k < size; k++) {
      worst = Math.max(
        worst,
        Math.abs((x?.re[k] ?? 0) - (y?.re[k] ?? 0)),
        Math.abs((x?.im[k] ?? 0) - (y?.im[k] ?? 0)),
      );
    }
  }
  return worst;
}

function withQubit(b: Branch, [r0, i0, r1, i1]: Qubit): Branch {
  const n = b.re.length;
  const re = new Float64Array(2 * n);
  const im = new Float64Array(2 * n);
  for (let k = 0; k < n; k++) {
    re[2 * k] = b.re[k]! * r0 - b.im[k]! * i0;
    im[2 * k] = b.re[k]! * i0 + b.im[k]! * r0;
    re[2 * k + 1] = b.re[k]! * r1 - b.im[k]! * i1;
    im[2 * k + 1] = b.re[k]! * i1 + b.im[k]! * r1;
  }
  return { ...b, re, im, axes: b.axes + 1 };
}

/** Axis a of A is bit A - 1 - a of the index. */
function applied(b: Branch, m: Float64Array, axes: readonly number[]): Branch {
  const d = 2 ** axes.length;
  const strides = axes.map((a) => 2 ** (b.axes - 1 - a));
  const all = strides.reduce((x, y) => x + y, 0);
  const re = new Float64Array(b.re.length);
  const im = new Float64Array(b.re.length);
  const offset = (r: number): number =>
    strides.reduce((sum, s, k) => sum + ((r >> (axes.length - 1 - k)) & 1) * s, 0);
  for (let base = 0; base < re.length; base++) {
    if (base & all) continue;
    for (let r = 0; r < d; r++) {
      for (let c = 0; c < d; c++) {
        const [x, y] = [m[r * d + c]!, m[d * d + r * d + c]!];
        const [p, q] = [base + offset(r), base + offset(c)];
        re[p]! += x * b.re[q]! - y * b.im[q]!;
        im[p]! += x * b.im[q]! + y * b.re[q]!;
      }
    }
  }
  return { ...b, re, im };
}

function projected(b: Branch, axis: number, value: boolean, bit: number): Branch {
  const s = 2 ** (b.axes - 1 - axis);
  const keep = (_: number, k: number): boolean => ((k & s) !== 0) === value;
  const bits = b.bits.slice();
  if (bit >= 0) bits[bit] = value;
  return {
    ...b,
    re: b.re.map((x, k) => (keep(x, k) ? x : 0)),
    im: b.im.map((x, k) => (keep(x, k) ? x : 0)),
    bits,
  };
}

function addDensity(out: Outcomes, b: Branch, kept: readonly number[], key: string): void {
  const d = 2 ** kept.length;
  const entry = out.get(key) ?? { re: new Float64Array(d * d), im: new Float64Array(d * d) };
  out.set(key, entry);
  const strides = kept.map((a) => 2 ** (b.axes - 1 - a));
  const all = strides.reduce((x, y) => x + y, 0);
  const offset = (r: number): number =>
    strides.reduce((sum, s, k) => sum + ((r >> (kept.length - 1 - k)) & 1) * s, 0);
  for (let base = 0; base < b.re.length; base++) {
    if (base & all) continue;
    for (let r = 0; r < d; r++) {
      for (let c = 0; c < d; c++) {
        const [p, q] = [base + offset(r), base + offset(c)];
        entry.re[r * d + c]! += b.re[p]! * b.re[q]! + b.im[p]! * b.im[q]!;
        entry.im[r * d + c]! += b.im[p]! * b.re[q]! - b.re[p]! * b.im[q]!;
      }
    }
  }
}
