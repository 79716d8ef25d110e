/**
 * Proves two circuits of any size equal by cancelling their gates one against the other.
 *
 * Method: both are written as gates on lines (`lines.ts`). Gates that the contract cannot see are taken out of both: at the
 * beginning, controls on inputs that are |0> or |1> for certain are put in; at the end, a gate goes that is at most a
 * control on lines that are measured with only controls behind, and anything on lines that nobody looks at (deferred
 * measurement: a measured line may be read but not changed, and a traced-out one may be turned at will). Then each
 * gate of the original is looked for in the other list; it may be taken from there when it commutes with all that stand before
 * it on its lines. What is left of both is compared densely when it is on few lines.
 * Proves: the same, with D at most 1 - cos(sum of angles of the pairs that were cancelled); it never proves a difference.
 * Cost: about (gates) x (gates that wait on a line); thousands of gates take well under a second.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { applyMatrixInto } from '../circuit/unitary.ts';
import type { Contract } from '../contract.ts';
import { identity, mul } from '../numeric/complex-matrix.ts';
import { distanceAngle, hilbertSchmidtDistance } from '../numeric/distance.ts';
import { isAnnotated } from './annotations.ts';
import { type LineGate, type Lines, lineGate, linesOf } from './lines.ts';

/** Largest angle at which two gates count as the same one. */
const SAME_ANGLE = 1e-6;
/** The same, where the question is where two circuits begin to differ. */
const EQUAL_ANGLE = 1e-11;
const REST_LINES_MAX = 8;
/** With more than this left over, nothing further is looked for. */
const REST_GATES_MAX = 64;
const COMMUTE_LINES_MAX = 5;

export type GateByGate = {
  /** Bound on D, from the sum of the angles of all pairs. */
  hilbertSchmidt: number;
  cancelled: number;
  /** Gates of both lists that were compared as a whole. */
  rest: number;
};

/** The proof, or null when this road does not lead there. `partner[bit]`: the other circuit's bit for each of the original's. */
export function compareGateByGate(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
  partner: readonly { original: number; rewritten: number }[],
): GateByGate | null {
  const n = contract.inputs.length;
  const a = linesOf(original, n, isAnnotated(original));
  const b = linesOf(rewritten, n, isAnnotated(rewritten));
  if (!a || !b) return null;
  if (!sameEnds(a, b, contract, partner)) return null;
  // a kept output is a qubit for somebody else: its outcome must not decide anything here
  const isRead = (output: number): boolean =>
    a.read.has(a.lineOfOutput[output]!) || b.read.has(b.lineOfOutput[output]!);
  if (contract.outputs.some((rule, output) => rule === 'kept' && isRead(output))) return null;
  const ends = endsOf(a, contract);
  const left = visible(a.gates, contract, ends);
  const right = visible(b.gates, contract, ends);
  const { angle, pairs, restLeft, restRight } = cancel(left, right);
  const rest = restAngle(restLeft, restRight);
  if (rest === null) return null;
  const total = Math.min(Math.PI / 2, angle + rest);
  return {
    hilbertSchmidt: 2 * Math.sin(total / 2) ** 2,
    cancelled: pairs,
    rest: restLeft.length + restRight.length,
  };
}

/** The lines of both texts where the first gates without a counterpart stand; null where there is none or it is not known. */
export function firstUnmatched(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
): { original: number | null; rewritten: number | null } | null {
  const n = contract.inputs.length;
  const a = linesOf(original, n, isAnnotated(original));
  const b = linesOf(rewritten, n, isAnnotated(rewritten));
  if (!a || !b) return null;
  const ends = endsOf(a, contract);
  const { restLeft, restRight } = cancel(
    visible(a.gates, contract, ends),
    visible(b.gates, contract, ends),
    EQUAL_ANGLE,
  );
  const first = (gates: readonly LineGate[]): number | null => gates.find(({ at }) => at !== undefined)?.at ?? null; // biome-ignore format: one choice
  return { original: first(restLeft), rewritten: first(restRight) };
}

type Ends = { isMeasured: Set<number>; isDropped: Set<number> };

/** Every output and bit must come from the same line in both. */
function sameEnds(
  a: Lines,
  b: Lines,
  contract: Contract,
  partner: readonly { original: number; rewritten: number }[],
): boolean {
  const bitsAgree = partner.every(
    ({ original, rewritten }) => a.lineOfBit[original] === b.lineOfBit[rewritten],
  );
  if (!bitsAgree) return false;
  return contract.outputs.every(
    (rule, output) => rule === 'dropped' || a.lineOfOutput[output] === b.lineOfOutput[output],
  );
}

function endsOf(a: Lines, { outputs }: Contract): Ends {
  const isMeasured = new Set<number>();
  const isDropped = new Set<number>();
  outputs.forEach((rule, output) => {
    const line = a.lineOfOutput[output]!;
    if (rule === 'measured') isMeasured.add(line);
    if (rule === 'dropped') isDropped.add(line);
  });
  for (const line of a.lineOfBit) if (line >= 0) isMeasured.add(line);
  return { isMeasured, isDropped };
}

/** The gates that an observer could notice, simplified by what is known of the inputs. */
function visible(gates: readonly LineGate[], contract: Contract, ends: Ends): LineGate[] {
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

type Cancelled = {
  angle: number;
  pairs: number;
  restLeft: LineGate[];
  restRight: LineGate[];
};

function cancel(
  left: readonly LineGate[],
  right: readonly LineGate[],
  sameAngle = SAME_ANGLE,
): Cancelled {
  const isTaken = new Uint8Array(right.length);
  const onLine = new Map<number, number[]>();
  right.forEach(({ lines }, k) => {
    for (const line of lines) {
      const list = onLine.get(line);
      if (list) list.push(k);
      else onLine.set(line, [k]);
    }
  });
  let angle = 0;
  let pairs = 0;
  const restLeft: LineGate[] = [];
  for (const gate of left) {
    // what waits of the original must be passed as well
    const isFree =
      restLeft.length <= REST_GATES_MAX && restLeft.every((other) => commute(other, gate));
    const found = isFree ? partnersOf(gate, right, onLine, sameAngle) : null;
    if (!found) {
      restLeft.push(gate);
      continue;
    }
    for (const index of found.taken) {
      isTaken[index] = 1;
      for (const line of gate.lines) {
        const list = onLine.get(line)!; // the gate itself stands there
        list.splice(list.indexOf(index), 1);
      }
    }
    angle += found.angle;
    pairs++;
  }
  const restRight = right.filter((_, k) => !isTaken[k]);
  return { angle, pairs, restLeft, restRight };
}

/** Gates on the same lines whose product may stand for one: a condition and its opposite, for example. */
const PRODUCT_MAX = 4;

/**
 * The gates of the other list that make up this one: the first on the same lines that can come before everything that
 * stands before them, one alone or the product of a few.
 */
function partnersOf(
  gate: LineGate,
  right: readonly LineGate[],
  onLine: ReadonlyMap<number, number[]>,
  sameAngle: number,
): { taken: number[]; angle: number } | null {
  const taken: number[] = [];
  let product: Float64Array | null = null;
  const d = 2 ** gate.lines.length;
  for (const index of onLine.get(gate.lines[0]!) ?? []) {
    const other = right[index]!;
    if (!isOnSameLines(gate, other)) continue;
    const canMove = gate.lines.every((line) =>
      (onLine.get(line) ?? []).every(
        (before) => before >= index || taken.includes(before) || commute(other, right[before]!),
      ),
    );
    if (!canMove) continue;
    const alone = angleBetween(gate.matrix, other.matrix, sameAngle);
    const isFirst = taken.every((before) => commute(other, right[before]!));
    if (alone !== null && isFirst) return { taken: [index], angle: alone };
    if (taken.length >= PRODUCT_MAX) continue;
    product = product ? mul(other.matrix, product, d) : other.matrix;
    taken.push(index);
    const angle = angleBetween(gate.matrix, product, sameAngle);
    if (angle !== null) return { taken, angle };
  }
  return null;
}

function isOnSameLines(a: LineGate, b: LineGate): boolean {
  return a.lines.length === b.lines.length && a.lines.every((line, k) => line === b.lines[k]);
}

/** The angle between two unitaries when it is tiny; null for different ones. */
function angleBetween(a: Float64Array, b: Float64Array, sameAngle: number): number | null {
  const angle = distanceAngle(hilbertSchmidtDistance(a, b).distance);
  return angle <= sameAngle ? angle : null;
}

/** Whether two gates commute for certain: apart, both controls on every common line, or by their matrices. */
function commute(a: LineGate, b: LineGate): boolean {
  const common = a.lines.filter((line) => b.lines.includes(line));
  if (common.length === 0) return true;
  const areControls = common.every(
    (line) => a.isControl[a.lines.indexOf(line)] && b.isControl[b.lines.indexOf(line)],
  );
  if (areControls) return true;
  const all = [...new Set([...a.lines, ...b.lines])].sort((x, y) => x - y);
  if (all.length > COMMUTE_LINES_MAX) return false;
  const d = 2 ** all.length;
  const [p, q] = [wideMatrix(a, all), wideMatrix(b, all)];
  const [pq, qp] = [mul(p, q, d), mul(q, p, d)];
  return pq.every((x, k) => Math.abs(x - qp[k]!) < 1e-14);
}

function wideMatrix({ lines, matrix }: LineGate, all: readonly number[]): Float64Array {
  const d = 2 ** all.length;
  const places = lines.map((line) => all.indexOf(line));
  return applyMatrixInto(identity(d), matrix, places, all.length, d);
}

/** The angle between what is left of both, by its matrix; null when that is on too many lines or not small. */
function restAngle(left: readonly LineGate[], right: readonly LineGate[]): number | null {
  const all = [...new Set([...left, ...right].flatMap(({ lines }) => lines))].sort((x, y) => x - y);
  if (all.length === 0) return 0;
  if (all.length > REST_LINES_MAX) return null;
  const d = 2 ** all.length;
  const [p, q] = [left, right].map((gates) => {
    const out = identity(d);
    for (const { lines, matrix } of gates) {
      const places = lines.map((line) => all.indexOf(line));
      applyMatrixInto(out, matrix, places, all.length, d);
    }
    return out;
  }) as [Float64Array, Float64Array];
  const angle = distanceAngle(hilbertSchmidtDistance(p, q).distance);
  return angle <= SAME_ANGLE ? angle : null;
}
