/**
 * Proves two gate lists on lines the same, or different, by summing over paths.
 *
 * Method: the first list and then the inverse of the second (or that first) are one sum over paths: a Hadamard opens a new path variable, maps
 * act on affine functions of the variables, and every phase is an angle on a parity of variables, with x y = (x + y - x^y)/2 for
 * the Hadamard's own. A variable that no line carries is summed out when its angles are multiples of pi/2: as a constraint
 * that replaces another variable ([HH]), or as a phase ([omega]); Amy, EPTCS 287, 1 (2019), section 4, written for parities.
 * This is done after every Hadamard, so that gates which meet their inverses vanish at once.
 * Proves: the same, when in the end every line carries its input and all phases are the same; different, when no sum is left
 * to do and they are not. With inputs that are |0> only those inputs count. The distance of circuits that differ by phases on
 * independent parities is exact: 1 - product of |cos(angle / 2)|.
 * Fails: null when a gate is no path operation, a variable cannot be summed out, or the work exceeds `WORK_MAX`.
 * Cost: about (gates) x (phases that hold a variable) x (variables / 32); thousands of gates take seconds at most.
 */
import { random } from '../numeric/random.ts';
import type { LineGate } from './lines.ts';
import { inverted, type PathOperation, pathOperations } from './path-operations.ts';

/** `isInverseFirst`: the input of a difference goes through the inverse of the second list first. */
export type PathSumAnswer = Verdict & { isInverseFirst: boolean };

type Verdict =
  | { isSame: true; hilbertSchmidt: number; variables: number }
  | {
      isSame: false;
      /** D over all inputs, where it is known. */
      hilbertSchmidt: number | null;
      variables: number;
      /** Lines that start in |1>, and in |+>; all others in |0>. */
      input: { one: number[]; plus: number[] };
      /** Probability to find the input again after the first circuit and the inverse of the second. */
      again: number;
    };

const GATES_MAX = 40_000;
/** Path variables that may wait at the same time. */
const OPEN_MAX = 4096;
/** Words of bits that may be touched, a few seconds. */
const WORK_MAX = 2e9;
/** An angle counts as a multiple of pi/2 within this; what was rounded off is added to the distance. */
const SAME_ANGLE = 1e-9;
const ZERO_ANGLE = 1e-13;
/** With no more than this in all angles together the answer is `same`, with the distance that they make. */
const SMALL_ANGLES = 1e-6;
const RANDOM_INPUTS = 64;
/** All inputs are gone through on up to this many lines. */
const INPUT_LINES_MAX = 16;
/** An input that comes back more often than this may mean a D of any size. */
const AGAIN_MAX = 1 - 1e-4;
/** Below this sum of angles D from their variance is right to its square, relatively. */
const SMALL_SUM = 1e-3;
const QUARTER = Math.PI / 2;

export function comparePathSums(
  left: readonly LineGate[],
  right: readonly LineGate[],
  lines: number,
  zeroLines: readonly number[] = [],
): PathSumAnswer | null {
  if (left.length + right.length > GATES_MAX) return null;
  const forward = operationsOf(left);
  const backward = forward && operationsOf(right);
  if (!forward || !backward) return null;
  const there = run([...forward, ...inverted(backward)], lines, zeroLines);
  if (there || zeroLines.length > 0) return there && { ...there, isInverseFirst: false };
  // the other way round has the same trace, and what hides in the middle there may stand at an end here
  const back = run([...inverted(backward), ...forward], lines, zeroLines);
  return back && { ...back, isInverseFirst: true };
}

function run(
  operations: readonly PathOperation[],
  lines: number,
  zeroLines: readonly number[],
): Verdict | null {
  const turns = operations.reduce((sum, { kind }) => sum + (kind === 'hadamard' ? 1 : 0), 0);
  const sum = new PathSum(lines, lines + Math.min(turns, OPEN_MAX), zeroLines);
  for (const operation of operations) if (!sum.apply(operation)) return null;
  return sum.verdict();
}

function operationsOf(gates: readonly LineGate[]): PathOperation[] | null {
  const known = new Map<Float64Array, PathOperation[] | null>();
  const all: PathOperation[] = [];
  for (const gate of gates) {
    // gates that share a matrix share what it is made of, on lines 0 .. k-1
    let local = known.get(gate.matrix);
    if (local === undefined) {
      local = pathOperations({ ...gate, lines: gate.lines.map((_, k) => k) });
      known.set(gate.matrix, local);
    }
    if (!local) return null;
    for (const operation of local) {
      all.push(
        operation.kind === 'hadamard'
          ? { kind: 'hadamard', line: gate.lines[operation.line]! }
          : { ...operation, lines: operation.lines.map((k) => gate.lines[k]!) },
      );
    }
  }
  return all;
}

/** An affine function of the variables. */
type Affine = { bits: Uint32Array; constant: 0 | 1 };
type Term = { bits: Uint32Array; angle: number };

class PathSum {
  private readonly carried: Affine[];
  private readonly terms = new Map<string, Term>();
  /** For each variable the keys of the terms that hold it. */
  private readonly holders: Set<string>[];
  private readonly words: number;
  private readonly lines: number;
  private readonly zero: Set<number>;
  private readonly isGone: Uint8Array;
  private readonly waiting = new Set<number>();
  /** Numbers for path variables: the next new one, and those that were summed out. */
  private variables: number;
  private readonly free: number[] = [];
  private turns = 0;
  /** Sum of the angles that were rounded off. */
  private slack = 0;
  private work = 0;
  private readonly opened: number;

  constructor(lines: number, variablesMax: number, zeroLines: readonly number[]) {
    this.lines = lines;
    this.words = Math.max(1, Math.ceil(variablesMax / 32));
    this.holders = Array.from({ length: variablesMax }, () => new Set<string>());
    this.isGone = new Uint8Array(variablesMax);
    this.zero = new Set(zeroLines);
    this.carried = Array.from({ length: lines }, (_, line): Affine => {
      const bits = new Uint32Array(this.words);
      if (!this.zero.has(line)) flip(bits, line);
      return { bits, constant: 0 };
    });
    this.variables = lines;
    this.opened = lines;
  }

  /** False when this road ends here. */
  apply(operation: PathOperation): boolean {
    switch (operation.kind) {
      case 'phases':
        this.addPhases(operation.lines, operation.phases);
        break;
      case 'map':
        this.map(operation.lines, operation.image);
        break;
      case 'hadamard':
        if (!this.open(operation.line)) return false;
        break;
    }
    this.settle();
    return this.work <= WORK_MAX;
  }

  private addPhases(lines: readonly number[], phases: Float64Array): void {
    const d = phases.length;
    for (let set = 1; set < d; set++) {
      // phase(s) = constant + sum over sets of c * parity(s & set)
      let c = 0;
      for (let s = 0; s < d; s++) c += parity(s & set) ? phases[s]! : -phases[s]!;
      c /= d / 2;
      if (c === 0) continue;
      const bits = new Uint32Array(this.words);
      let constant: 0 | 1 = 0;
      lines.forEach((line, k) => {
        if (((set >> (lines.length - 1 - k)) & 1) === 0) return;
        xorInto(bits, this.carried[line]!.bits);
        constant = (constant ^ this.carried[line]!.constant) as 0 | 1;
      });
      this.add(bits, constant, c);
    }
  }

  private map(lines: readonly number[], image: Int32Array): void {
    const k = lines.length;
    const before = lines.map((line) => this.carried[line]!);
    lines.forEach((line, to) => {
      const bit = 1 << (k - 1 - to);
      const value: Affine = {
        bits: new Uint32Array(this.words),
        constant: image[0]! & bit ? 1 : 0,
      };
      before.forEach((from, at) => {
        if (((image[1 << (k - 1 - at)]! ^ image[0]!) & bit) === 0) return;
        xorInto(value.bits, from.bits);
        value.constant = (value.constant ^ from.constant) as 0 | 1;
      });
      this.carried[line] = value;
    });
    this.work += k * k * this.words;
    for (const { bits } of before) this.wake(bits);
  }

  private open(line: number): boolean {
    const variable = this.free.pop() ?? this.variables++;
    if (variable >= this.isGone.length) return false;
    this.isGone[variable] = 0;
    this.turns++;
    const old = this.carried[line]!;
    const bits = new Uint32Array(this.words);
    flip(bits, variable);
    // pi x y = pi/2 (x + y - x^y); with a constant, pi (1 - x) y
    this.add(old.bits, old.constant, QUARTER);
    this.add(bits, 0, QUARTER);
    const both = bits.slice();
    xorInto(both, old.bits);
    this.add(both, old.constant, -QUARTER);
    this.carried[line] = { bits, constant: 0 };
    this.wake(old.bits);
    return true;
  }

  private wake(bits: Uint32Array): void {
    for (const variable of members(bits)) if (variable >= this.opened) this.waiting.add(variable);
  }

  /** angle * (bits ^ constant), up to a global phase. */
  private add(bits: Uint32Array, constant: 0 | 1, angle: number): void {
    const key = keyOf(bits);
    this.work += this.words;
    const known = this.terms.get(key);
    const sum = turned((known?.angle ?? 0) + (constant ? -angle : angle));
    const list = known ? null : members(bits);
    if (list?.length === 0) return;
    if (Math.abs(sum) <= ZERO_ANGLE) {
      this.slack += Math.abs(sum);
      if (known) this.remove(key, known);
      return;
    }
    if (known) {
      known.angle = sum;
      this.wake(known.bits);
      return;
    }
    this.terms.set(key, { bits: bits.slice(), angle: sum });
    for (const variable of list!) {
      this.holders[variable]!.add(key);
      if (variable >= this.opened) this.waiting.add(variable);
    }
  }

  private remove(key: string, { bits }: Term): void {
    this.terms.delete(key);
    this.work += this.words;
    for (const variable of members(bits)) {
      this.holders[variable]!.delete(key);
      if (variable >= this.opened) this.waiting.add(variable);
    }
  }

  /** Sums out what can be, newest variables first. */
  private settle(): void {
    while (this.waiting.size > 0 && this.work <= WORK_MAX) {
      let newest = -1;
      for (const variable of this.waiting) newest = Math.max(newest, variable);
      this.waiting.delete(newest);
      if (!this.isGone[newest]) this.sumOut(newest);
    }
  }

  private isCarried(variable: number): boolean {
    this.work += this.lines;
    return this.carried.some(({ bits }) => has(bits, variable));
  }

  private sumOut(variable: number): void {
    const keys = [...this.holders[variable]!];
    let total = 0;
    let off = 0;
    for (const key of keys) {
      const { angle } = this.terms.get(key)!;
      const steps = Math.round(angle / QUARTER);
      off += Math.abs(angle - steps * QUARTER);
      if (off > SAME_ANGLE) return;
      total += steps;
    }
    if (this.isCarried(variable)) return;
    // the factor of the variable: total pi/2 + pi (parity of the terms with an odd number of steps)
    const sum = new Uint32Array(this.words);
    const rest: [Uint32Array, number][] = [];
    for (const key of keys) {
      const term = this.terms.get(key)!;
      const others = term.bits.slice();
      flip(others, variable);
      if (Math.round(term.angle / QUARTER) % 2 !== 0) xorInto(sum, others);
      rest.push([others, term.angle]);
    }
    const quarters = ((total % 4) + 4) % 4;
    let replaced = -1;
    if (quarters % 2 === 0) {
      const list = members(sum);
      replaced = list.at(-1) ?? -1;
      // an equation among inputs alone is none that a sum can be freed of
      if (replaced < this.opened) return;
    }
    this.slack += off;
    this.isGone[variable] = 1;
    for (const key of keys) this.remove(key, this.terms.get(key)!);
    for (const [bits, angle] of rest) this.add(bits, 0, angle);
    if (replaced < 0) this.add(sum, 0, quarters === 1 ? -QUARTER : QUARTER);
    else this.replace(replaced, sum, quarters === 2 ? 1 : 0);
    this.free.push(variable);
  }

  /** Puts `equation` without the variable, plus the constant, in its place: equation = constant. */
  private replace(variable: number, equation: Uint32Array, constant: 0 | 1): void {
    this.isGone[variable] = 1;
    for (const key of [...this.holders[variable]!]) {
      const term = this.terms.get(key)!;
      this.remove(key, term);
      const bits = term.bits.slice();
      xorInto(bits, equation);
      this.add(bits, constant, term.angle);
    }
    for (const value of this.carried) {
      if (!has(value.bits, variable)) continue;
      this.wake(value.bits);
      xorInto(value.bits, equation);
      value.constant = (value.constant ^ constant) as 0 | 1;
      this.wake(value.bits);
    }
    this.free.push(variable);
  }

  verdict(): Verdict | null {
    const opened = this.turns;
    const left = range(this.opened, this.variables).filter((variable) => !this.isGone[variable]);
    if (left.length > 0) return this.spread(left, opened);
    const moved = this.carried.findIndex(({ bits, constant }, line) => {
      const own = bits.slice();
      if (!this.zero.has(line)) flip(own, line);
      return constant === 1 || !isEmpty(own);
    });
    if (moved >= 0) return this.shifted(moved, opened);
    return this.phasesOnly(opened);
  }

  /** Path variables that lines still carry: the input is spread over several states. */
  private spread(left: readonly number[], variables: number): Verdict | null {
    const isAllCarried = rank(this.carried.map(({ bits }) => only(bits, this.opened))) === left.length; // biome-ignore format: one condition
    if (!isAllCarried) return null;
    // an input state is found again with amplitude 2^(-left/2) at most
    const again = this.reaches(left.length) ? 2 ** -left.length : 0;
    return { isSame: false, hilbertSchmidt: null, variables, input: { one: [], plus: [] }, again };
  }

  /** Whether the input |0...0> is among the states it is spread over. */
  private reaches(unknowns: number): boolean {
    // the equations "what a line carries, with all inputs 0, is 0" have a solution: Rouche-Capelli
    const extended = this.carried.map(({ bits, constant }) => {
      const longer = new Uint32Array(bits.length + 1);
      longer.set(only(bits, this.opened));
      longer[bits.length] = constant;
      return longer;
    });
    return rank(extended) === unknowns;
  }

  /** A basis state that ends as another one. */
  private shifted(line: number, variables: number): Verdict {
    const { bits, constant } = this.carried[line]!;
    const own = bits.slice();
    if (!this.zero.has(line)) flip(own, line);
    const one = constant === 1 ? [] : members(own).slice(0, 1);
    return { isSame: false, hilbertSchmidt: constant === 1 && isEmpty(own) ? 1 : null, variables, input: { one, plus: [] }, again: 0 }; // biome-ignore format: one answer
  }

  /** All lines are right, and phases on parities of the inputs are left. */
  private phasesOnly(variables: number): Verdict | null {
    const terms = [...this.terms.values()];
    const worst = terms.reduce((sum, { angle }) => sum + Math.abs(angle), this.slack);
    const isIndependent = rank(terms.map(({ bits }) => bits)) === terms.length;
    // different parities are uncorrelated in pairs: the phases have the variance sum a^2 / 4, and D is half of it for small ones
    const variance = terms.reduce((sum, { angle }) => sum + angle * angle, 0) / 4;
    const nearly = worst < SMALL_SUM ? variance / 2 : null;
    const exact = isIndependent ? oneMinusProduct(terms) : (nearly ?? this.distanceByInputs(terms));
    // at most half of all angles lies between a phase and the middle of all phases
    const bound = 2 * Math.sin(Math.min(Math.PI, worst) / 4) ** 2;
    if (worst <= SMALL_ANGLES) return { isSame: true, hilbertSchmidt: exact ?? bound, variables };
    const found = this.turnedInput();
    if (found) {
      // without D a small difference cannot be held against a tolerance
      if (exact === null && found.again > AGAIN_MAX) return null;
      return { isSame: false, hilbertSchmidt: exact, variables, ...found };
    }
    const isNone = this.vanishes(terms);
    return isNone ? { isSame: true, hilbertSchmidt: 2 * Math.sin(this.slack / 4) ** 2, variables } : null; // biome-ignore format: one choice
  }

  /** D from the phases of all inputs, as a mean of squares; null where there are too many. */
  private distanceByInputs(terms: readonly Term[]): number | null {
    const used = [...new Set(terms.flatMap(({ bits }) => members(bits)))];
    if (used.length > INPUT_LINES_MAX || terms.length * 2 ** used.length > WORK_MAX / 64)
      return null;
    const place = new Map(used.map((line, k) => [line, k]));
    const sets = terms.map(({ bits }) => members(bits).reduce((mask, line) => mask | (1 << place.get(line)!), 0)); // biome-ignore format: one list
    const phases = Float64Array.from({ length: 2 ** used.length }, (_, input) =>
      terms.reduce((sum, { angle }, k) => sum + (parity(input & sets[k]!) ? angle : 0), 0),
    );
    let [re, im] = [0, 0];
    for (const phase of phases) {
      re += Math.cos(phase);
      im += Math.sin(phase);
    }
    const middle = Math.atan2(im, re);
    let sum = 0;
    for (const phase of phases) sum += 2 * Math.sin((phase - middle) / 2) ** 2;
    return sum / phases.length;
  }

  /** Basis states with one line in |+> that do not come back: single flips first, then random ones. */
  private turnedInput(): { input: { one: number[]; plus: number[] }; again: number } | null {
    const free = range(0, this.lines).filter((line) => !this.zero.has(line));
    const draw = random(1, 'path-sum inputs');
    const flipped = free.length ** 2 * this.terms.size < 1e7 ? free.map((line) => [line]) : [];
    const drawn = range(0, RANDOM_INPUTS).map(() => free.filter(() => draw() < 0.5));
    let best: { input: { one: number[]; plus: number[] }; again: number } | null = null;
    for (const start of [[], ...flipped, ...drawn]) {
      for (const plus of free) {
        const one = start.filter((line) => line !== plus);
        const step = this.phaseOf([...one, plus]) - this.phaseOf(one);
        const again = Math.cos(step / 2) ** 2;
        // what rounding makes of equal phases is no difference
        if (Math.sin(step / 2) ** 2 <= (1e-13 + this.slack) ** 2) continue;
        if (!best || again < best.again) best = { input: { one, plus: [plus] }, again };
      }
      if (best) return best;
    }
    return null;
  }

  private phaseOf(ones: readonly number[]): number {
    let sum = 0;
    for (const { bits, angle } of this.terms.values()) {
      if (ones.reduce((odd, line) => odd !== has(bits, line), false)) sum += angle;
    }
    return sum;
  }

  /**
   * Whether angles that are multiples of pi/4 are a multiple of 2 pi on every input: by their coefficients as a polynomial,
   * parity of a set = sum over its subsets T of (-2)^(|T| - 1) times the product of T; from four factors on all vanish.
   */
  private vanishes(terms: readonly Term[]): boolean {
    const eighths = new Map<string, number>();
    const put = (key: string, value: number): void => {
      eighths.set(key, (eighths.get(key) ?? 0) + value);
    };
    for (const { bits, angle } of terms) {
      const steps = Math.round(angle / (Math.PI / 4));
      if (Math.abs(angle - (steps * Math.PI) / 4) > SAME_ANGLE) return false;
      this.slack += Math.abs(angle - (steps * Math.PI) / 4);
      const list = members(bits);
      this.work += list.length ** 3 / 6;
      if (this.work > WORK_MAX) return false;
      list.forEach((a, i) => {
        put(`${a}`, steps);
        for (let j = i + 1; j < list.length; j++) {
          put(`${a},${list[j]}`, -2 * steps);
          for (let k = j + 1; k < list.length; k++) put(`${a},${list[j]},${list[k]}`, 4 * steps);
        }
      });
    }
    return [...eighths.values()].every((value) => value % 8 === 0);
  }
}

/** 1 - product of |cos(angle/2)| without cancellation. */
function oneMinusProduct(terms: readonly Term[]): number {
  let log = 0;
  for (const { angle } of terms) log += Math.log1p(-(Math.sin(angle / 2) ** 2)) / 2;
  return -Math.expm1(log);
}

function turned(angle: number): number {
  return angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
}

function range(from: number, to: number): number[] {
  return Array.from({ length: to - from }, (_, k) => from + k);
}

function parity(word: number): number {
  let v = word ^ (word >>> 16);
  v ^= v >>> 8;
  v ^= v >>> 4;
  return (0x6996 >>> (v & 15)) & 1;
}

function flip(bits: Uint32Array, k: number): void {
  bits[k >> 5]! ^= 1 << (k & 31);
}

function has(bits: Uint32Array, k: number): boolean {
  return ((bits[k >> 5]! >>> (k & 31)) & 1) === 1;
}

function xorInto(bits: Uint32Array, others: Uint32Array): void {
  for (let w = 0; w < bits.length; w++) bits[w]! ^= others[w]!;
}

function isEmpty(bits: Uint32Array): boolean {
  return bits.every((word) => word === 0);
}

function members(bits: Uint32Array): number[] {
  const list: number[] = [];
  for (let w = 0; w < bits.length; w++) {
    let word = bits[w]!;
    while (word !== 0) {
      list.push(32 * w + 31 - Math.clz32(word & -word));
      word &= word - 1;
    }
  }
  return list;
}

function keyOf(bits: Uint32Array): string {
  return String.fromCharCode(...new Uint16Array(bits.buffer, bits.byteOffset, 2 * bits.length));
}

/** The bits from a place on. */
function only(bits: Uint32Array, from: number): Uint32Array {
  const out = bits.slice();
  for (const k of members(out)) if (k < from) flip(out, k);
  return out;
}

function rank(list: readonly Uint32Array[]): number {
  const rows = list.map((bits) => bits.slice());
  let found = 0;
  for (let k = 0; k < rows.length; k++) {
    const row = rows[k]!;
    const [pivot] = members(row);
    if (pivot === undefined) continue;
    found++;
    for (let other = k + 1; other < rows.length; other++) {
      if (has(rows[other]!, pivot)) xorInto(rows[other]!, row);
    }
  }
  return found;
}
