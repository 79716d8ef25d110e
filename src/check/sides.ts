/**
 * Reduces two circuits to the gates that an observer could notice.
 *
 * Both are written as gates on lines (`lines.ts`). Gates that the contract cannot see are taken out of both: at the
 * beginning, controls on inputs that are |0> or |1> for certain are put in; at the end, a gate goes that is at most a
 * control on lines that are measured with only controls behind, and anything on lines that nobody looks at (deferred
 * measurement: a measured line may be read but not changed, and a traced-out one may be turned at will; Nielsen, Chuang
 * (2010), 4.4). Two circuits are the same when what is left of them is.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { identity } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { isAnnotated } from './annotations.ts';
import { type LineGate, type Lines, lineGate, linesOf } from './lines.ts';

/** Two circuits as what an observer could notice of them. */
export type Sides = {
  left: LineGate[];
  right: LineGate[];
  /** All their gates, seen or not: what is taken out may differ between two wordings of one circuit. */
  asWritten: { left: LineGate[]; right: LineGate[] };
  /** Number of lines of both. */
  lines: number;
  zeroLines: number[];
  /** All outputs are kept, so that a difference of the two lists can be seen. */
  isWhole: boolean;
};

/** Null where a circuit is no list of gates on lines. `partner[bit]`: the other circuit's bit for each of the original's. */
export function sidesOf(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
  partner: readonly { original: number; rewritten: number }[],
): Sides | null {
  const n = contract.inputs.length;
  const a = linesOf(original, n, isAnnotated(original));
  const b = linesOf(rewritten, n, isAnnotated(rewritten));
  if (!a || !b) return null;
  const isBlock = partner.length === 0 && contract.outputs.every((rule) => rule === 'kept');
  const swaps = swapsBetween(a, b, contract, partner);
  if (!swaps) return null;
  // a kept output is a qubit for somebody else: its outcome must not decide anything here
  const isRead = (output: number): boolean =>
    a.read.has(a.lineOfOutput[output]!) || b.read.has(b.lineOfOutput[output]!);
  if (contract.outputs.some((rule, output) => rule === 'kept' && isRead(output))) return null;
  // measured in both, a kept output is dephased in both, which the gates that only read it do not notice
  const isDephased = (lines: Lines, output: number): boolean =>
    lines.dephased.has(lines.lineOfOutput[output]!);
  if (contract.outputs.some((rule, output) => rule === 'kept' && isDephased(a, output) !== isDephased(b, output))) return null; // biome-ignore format: one condition
  const ends = endsOf(a, contract);
  const lines = Math.max(a.count, b.count);
  const moved = [...b.gates, ...swaps];
  return {
    left: visible(a.gates, contract, ends),
    right: visible(moved, contract, ends),
    asWritten: { left: a.gates, right: moved },
    lines,
    // lines beyond the inputs are extra wires of one circuit
    zeroLines: Array.from({ length: lines }, (_, line) => line).filter((line) => contract.inputs[line] !== 'any'), // biome-ignore format: one list
    isWhole: lines === n && isBlock,
  };
}

type Ends = { isMeasured: Set<number>; isDropped: Set<number> };

/** Swaps that bring what is seen of the second circuit to the lines of the first one; null when something is missing. */
function swapsBetween(
  a: Lines,
  b: Lines,
  { outputs }: Contract,
  partner: readonly { original: number; rewritten: number }[],
): LineGate[] | null {
  const pairs = [
    ...outputs.flatMap((rule, output): [number, number][] => (rule === 'dropped' ? [] : [[a.lineOfOutput[output]!, b.lineOfOutput[output]!]])), // biome-ignore format: one list
    ...partner.map(({ original, rewritten }): [number, number] => [a.lineOfBit[original]!, b.lineOfBit[rewritten]!]), // biome-ignore format: one list
  ];
  const wanted = new Map<number, number>();
  for (const [to, from] of pairs) {
    if (to < 0 && from < 0) continue;
    if (to < 0 || from < 0 || (wanted.get(from) ?? to) !== to) return null;
    wanted.set(from, to);
  }
  if (new Set(wanted.values()).size < wanted.size) return null;
  const swaps: LineGate[] = [];
  // where what stood on each line is by now
  const now = new Map<number, number>();
  for (const [from, to] of wanted) {
    const here = now.get(from) ?? from;
    if (here === to) continue;
    swaps.push(lineGate([here, to], SWAP));
    for (const other of wanted.keys()) if ((now.get(other) ?? other) === to) now.set(other, here);
    now.set(from, to);
  }
  return swaps;
}

const SWAP = new Float64Array(32);
for (const at of [0, 6, 9, 15]) SWAP[at] = 1;

export function endsOf(a: Lines, { outputs }: Contract): Ends {
  const isMeasured = new Set<number>();
  const isDropped = new Set<number>();
  outputs.forEach((rule, output) => {
    const line = a.lineOfOutput[output]!;
    if (rule === 'measured') isMeasured.add(line);
    if (rule === 'dropped') isDropped.add(line);
  });
  for (const line of a.lineOfBit) if (line >= 0) isMeasured.add(line);
  // nobody keeps the qubit, but its outcome is in a bit that somebody sees
  for (const line of isMeasured) isDropped.delete(line);
  return { isMeasured, isDropped };
}

/** The gates that an observer could notice, simplified by what is known of the inputs. */
export function visible(gates: readonly LineGate[], contract: Contract, ends: Ends): LineGate[] {
  return withoutTail(withKnownInputs(gates, contract), ends);
}

function withKnownInputs(gates: readonly LineGate[], { inputs }: Contract): LineGate[] {
  const known = new Map<number, 0 | 1>();
  inputs.forEach((rule, line) => {
    if (rule === 'zero') known.set(line, 0);
  });
  return gates.flatMap((gate) => {
    let here = gate;
    for (const line of gate.lines) {
      const value = known.get(line);
      const place = here.lines.indexOf(line);
      if (value !== undefined && here.isControl[place]) here = restricted(here, place, value);
    }
    if (here.lines.length === 0 || isIdentity(here)) return [];
    for (const line of here.lines) {
      const value = known.get(line);
      if (value === undefined) continue;
      if (here.lines.length === 1 && isFlip(here)) known.set(line, value === 0 ? 1 : 0);
      else known.delete(line);
    }
    return [here];
  });
}

/** The block of a gate for one value of a line on which it is a control. */
function restricted({ lines, matrix, at }: LineGate, place: number, value: 0 | 1): LineGate {
  const k = lines.length;
  const d = 2 ** (k - 1);
  const bit = k - 1 - place;
  const wide = (state: number): number =>
    ((state >> bit) << (bit + 1)) | (value << bit) | (state & ((1 << bit) - 1));
  const out = new Float64Array(2 * d * d);
  for (let r = 0; r < d; r++) {
    for (let c = 0; c < d; c++) {
      const from = wide(r) * 2 * d + wide(c);
      out[r * d + c] = matrix[from]!;
      out[d * d + r * d + c] = matrix[4 * d * d + from]!;
    }
  }
  const here = lineGate(
    lines.filter((_, k) => k !== place),
    out,
  );
  return at === undefined ? here : { ...here, at };
}

/** The identity up to a phase. */
function isIdentity({ lines, matrix }: LineGate): boolean {
  const d = 2 ** lines.length;
  return hilbertSchmidtDistance(identity(d), matrix).distance < 1e-30;
}

function isFlip({ matrix }: LineGate): boolean {
  const size = (k: number): number => Math.hypot(matrix[k]!, matrix[4 + k]!);
  return size(0) < 1e-15 && size(3) < 1e-15;
}

function withoutTail(gates: readonly LineGate[], { isMeasured, isDropped }: Ends): LineGate[] {
  // lines whose Z basis is only read or permuted later, together with others of the kind, before it is measured; and lines
  // on which nothing comes later. A diagonal gate on the former stays diagonal up to the measurement, and is not seen.
  const onlyControls = new Set(isMeasured);
  const isFree = new Set(isDropped);
  const kept: LineGate[] = [];
  for (let k = gates.length - 1; k >= 0; k--) {
    const gate = gates[k]!;
    const isUnseen = gate.lines.every(
      (line, at) => isFree.has(line) || (onlyControls.has(line) && gate.isControl[at]),
    );
    if (isUnseen) continue;
    const permutes = gate.lines.every((line) => onlyControls.has(line)) && isMonomial(gate);
    gate.lines.forEach((line, at) => {
      isFree.delete(line);
      if (!permutes && !gate.isControl[at]) onlyControls.delete(line);
    });
    kept.push(gate);
  }
  return kept.reverse();
}

/** A permutation of basis states up to phases. */
function isMonomial({ lines, matrix }: LineGate): boolean {
  const d = 2 ** lines.length;
  for (let r = 0; r < d; r++) {
    let count = 0;
    for (let c = 0; c < d; c++) {
      if (Math.hypot(matrix[r * d + c]!, matrix[d * d + r * d + c]!) > 1e-15) count++;
    }
    if (count !== 1) return false;
  }
  return true;
}
