/**
 * Random programs for tests as statement trees, with rewritings that change nothing, slips that may change something,
 * and the text of a tree in OpenQASM 3. Bits 0 .. BITS-1 are seen (`c`), those above are scratch bits (`t`).
 */
import type { Random } from '../../src/numeric/random.ts';

export type Modifier = 'ctrl' | 'negctrl' | 'inv' | ['pow', number];
export type Condition =
  | ['constant', boolean]
  | ['bit', number]
  | ['not', Condition]
  | ['xor' | 'and' | 'or', Condition, Condition]
  | ['equals', number, number, number];
type Gate = ['gate', Modifier[], string, number[], number[]];
export type Statement =
  | Gate
  | ['measure', number, number]
  | ['reset', number]
  | ['assign', number, Condition]
  | ['if', Condition, Statement[], Statement[]];

export const BITS = 3;

/** Name, angles, wires. */
const BASE: readonly (readonly [string, number, number])[] = [
  ['x', 0, 1],
  ['y', 0, 1],
  ['z', 0, 1],
  ['h', 0, 1],
  ['s', 0, 1],
  ['sdg', 0, 1],
  ['t', 0, 1],
  ['tdg', 0, 1],
  ['sx', 0, 1],
  ['rx', 1, 1],
  ['ry', 1, 1],
  ['rz', 1, 1],
  ['p', 1, 1],
  ['cx', 0, 2],
  ['cx', 0, 2],
  ['cz', 0, 2],
  ['cp', 1, 2],
  ['swap', 0, 2],
];

export type Dice = {
  below(n: number): number;
  pick<T>(list: readonly T[]): T;
  chance(p: number): boolean;
};

export function diceOf(draw: Random): Dice {
  const below = (n: number): number => Math.floor(draw() * n);
  return { below, pick: (list) => list[below(list.length)]!, chance: (p) => draw() < p };
}

const angleOf = ({ below }: Dice): number => (1 + below(60)) / 10 - 3;

function wiresOf(dice: Dice, wires: number, count: number): number[] {
  const rest = Array.from({ length: wires }, (_, k) => k);
  return Array.from({ length: count }, () => rest.splice(dice.below(rest.length), 1)[0]!);
}

const CLIFFORD = BASE.filter(([name, angles]) => angles === 0 && !/^t/.test(name));

/** Which programs: of all gates and conditions, or of those that a tableau takes. */
export type Kind = 'any' | 'clifford';

function randomGate(dice: Dice, wires: number, kind: Kind): Gate {
  for (;;) {
    const [name, angles, count] = dice.pick(kind === 'any' ? BASE : CLIFFORD);
    if (kind === 'clifford') {
      if (count <= wires) return ['gate', [], name, [], wiresOf(dice, wires, count)];
      continue;
    }
    const modifiers: Modifier[] = [];
    if (dice.chance(0.15)) modifiers.push(dice.pick(['ctrl', 'negctrl'] as const));
    if (dice.chance(0.05)) modifiers.push('inv');
    if (count === 1 && dice.chance(0.06)) modifiers.push(['pow', dice.pick([0.5, -0.3, 2])]);
    const total = count + (modifiers[0] === 'ctrl' || modifiers[0] === 'negctrl' ? 1 : 0);
    if (total > wires) continue;
    const list = Array.from({ length: angles }, () => angleOf(dice));
    return ['gate', modifiers, name, list, wiresOf(dice, wires, total)];
  }
}

function randomCondition(dice: Dice, programs: Kind, depth = 2): Condition {
  if (programs === 'clifford') {
    const bit = (): Condition => ['bit', dice.below(BITS)];
    return dice.chance(0.5) ? bit() : ['xor', bit(), bit()];
  }
  const kind = dice.below(depth > 0 ? 9 : 4);
  if (kind < 4) return ['bit', dice.below(BITS)];
  if (kind === 4) return ['not', randomCondition(dice, programs, depth - 1)];
  if (kind === 5) return ['equals', 0, BITS, dice.below(2 ** BITS)];
  const operator = kind < 8 ? 'xor' : dice.pick(['and', 'or'] as const);
  return [
    operator,
    randomCondition(dice, programs, depth - 1),
    randomCondition(dice, programs, depth - 1),
  ];
}

/** `room` bounds the measurements and resets, each of which doubles the branches. */
export function randomProgram(
  dice: Dice,
  wires: number,
  length: number,
  programs: Kind = 'any',
): Statement[] {
  let room = 6;
  const list = (count: number, depth: number): Statement[] =>
    Array.from({ length: count }, () => statement(depth));
  const statement = (depth: number): Statement => {
    const kind = dice.below(20);
    if (kind < 4 && room-- > 0) return ['measure', dice.below(wires), dice.below(BITS)];
    if (kind < 6 && room-- > 0) return ['reset', dice.below(wires)];
    if (kind === 6 && programs === 'any')
      return ['assign', dice.below(BITS), randomCondition(dice, programs)];
    if (kind < 11 && programs === 'clifford') {
      return ['if', randomCondition(dice, programs), [randomGate(dice, wires, programs)], []];
    }
    if (kind < 11 && depth > 0) {
      const otherwise = dice.chance(0.4) ? list(1, depth - 1) : [];
      return ['if', randomCondition(dice, programs), list(1 + dice.below(2), depth - 1), otherwise];
    }
    return randomGate(dice, wires, programs);
  };
  // from |0> and bits of 0 most conditions would never hold
  const first = Array.from({ length: wires }, (_, wire): Statement[] => {
    const turn: Statement =
      programs === 'any'
        ? ['gate', [], 'ry', [angleOf(dice)], [wire]]
        : ['gate', [], 'h', [], [wire]];
    return dice.chance(0.4) ? [turn, ['measure', wire, dice.below(BITS)], turn] : [turn];
  });
  const body = [...first.flat(), ...list(length, 2)];
  if (programs === 'any') return body;
  // every bit is an outcome
  const last = wiresOf(dice, wires, Math.min(wires, BITS));
  return [...body, ...last.map((wire, bit): Statement => ['measure', wire, bit])];
}

function conditionText(condition: Condition): string {
  const bit = (b: number): string => (b < BITS ? `c[${b}]` : `t[${b - BITS}]`);
  switch (condition[0]) {
    case 'constant':
      return String(condition[1]);
    case 'bit':
      return bit(condition[1]);
    case 'not':
      return `!(${conditionText(condition[1])})`;
    case 'equals':
      return `(c == ${condition[3]})`;
    default: {
      const sign = { xor: '^', and: '&&', or: '||' }[condition[0]];
      return `(${conditionText(condition[1])} ${sign} ${conditionText(condition[2])})`;
    }
  }
}

function statementText(statement: Statement): string {
  const bit = (b: number): string => conditionText(['bit', b]);
  switch (statement[0]) {
    case 'gate': {
      const [, modifiers, name, angles, wires] = statement;
      const before = modifiers.map((m) => (typeof m === 'string' ? `${m} @ ` : `pow(${m[1]}) @ `));
      const list = angles.length > 0 ? `(${angles.join(', ')})` : '';
      return `${before.join('')}${name}${list} ${wires.map((w) => `q[${w}]`).join(', ')};`;
    }
    case 'measure':
      return `${bit(statement[2])} = measure q[${statement[1]}];`;
    case 'reset':
      return `reset q[${statement[1]}];`;
    case 'assign':
      return `${bit(statement[1])} = ${conditionText(statement[2])};`;
    case 'if': {
      const [, condition, then, otherwise] = statement;
      const inner = (list: readonly Statement[]): string => list.map(statementText).join(' ');
      const end = otherwise.length > 0 ? ` else { ${inner(otherwise)} }` : '';
      return `if (${conditionText(condition)}) { ${inner(then)} }${end}`;
    }
  }
}

export function programText(statements: readonly Statement[], wires: number, bits: number): string {
  const scratch = bits > BITS ? `bit[${bits - BITS}] t;\n` : '';
  const body = statements.map(statementText).join('\n');
  return `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[${wires}] q;\nbit[${BITS}] c;\n${scratch}${body}\n`;
}

const read = (condition: Condition): number[] => {
  switch (condition[0]) {
    case 'constant':
      return [];
    case 'bit':
      return [condition[1]];
    case 'not':
      return read(condition[1]);
    case 'equals':
      return Array.from({ length: condition[2] }, (_, k) => condition[1] + k);
    default:
      return [...read(condition[1]), ...read(condition[2])];
  }
};

/** What a statement touches: wires as `q0`, bits read as `r0`, bits written as `w0`. */
function touched(statement: Statement): { wires: number[]; read: number[]; written: number[] } {
  switch (statement[0]) {
    case 'gate':
      return { wires: statement[4], read: [], written: [] };
    case 'measure':
      return { wires: [statement[1]], read: [], written: [statement[2]] };
    case 'reset':
      return { wires: [statement[1]], read: [], written: [] };
    case 'assign':
      return { wires: [], read: read(statement[2]), written: [statement[1]] };
    case 'if': {
      const inner = [...statement[2], ...statement[3]].map(touched);
      return {
        wires: inner.flatMap((t) => t.wires),
        read: [...read(statement[1]), ...inner.flatMap((t) => t.read)],
        written: inner.flatMap((t) => t.written),
      };
    }
  }
}

function areApart(a: Statement, b: Statement): boolean {
  const [x, y] = [touched(a), touched(b)];
  const meet = (p: readonly number[], q: readonly number[]): boolean =>
    p.some((k) => q.includes(k));
  const bits = meet(x.written, [...y.written, ...y.read]) || meet(y.written, x.read);
  return !bits && !meet(x.wires, y.wires);
}

/** All lists of statements of a program, the blocks of its ifs included. */
function listsOf(statements: Statement[]): Statement[][] {
  return [
    statements,
    ...statements.flatMap((s) => (s[0] === 'if' ? [...listsOf(s[2]), ...listsOf(s[3])] : [])),
  ];
}

const plain = (name: string, wires: number[], ...angles: number[]): Gate => [
  'gate',
  [],
  name,
  angles,
  wires,
];

/** Other gates for the same one up to a phase, which no observer of a whole gate sees. */
function respelled(gate: Gate): Gate[] | null {
  const [, modifiers, name, angles, wires] = gate;
  if (modifiers.length > 0) return null;
  const [a, b] = wires as [number, number];
  switch (name) {
    case 'swap':
      return [plain('cx', [a, b]), plain('cx', [b, a]), plain('cx', [a, b])];
    case 'cx':
      return [plain('h', [b]), plain('cz', [a, b]), plain('h', [b])];
    case 'cz':
      return [plain('h', [a]), plain('cx', [b, a]), plain('h', [a])];
    case 'rx':
      return [plain('h', [a]), plain('rz', [a], angles[0]!), plain('h', [a])];
    case 'rz':
      return [plain('p', [a], angles[0]!)];
    case 't':
      return [plain('rz', [a], Math.PI / 4)];
    case 'y':
      return [plain('z', [a]), plain('x', [a])];
    case 'sx':
      return [plain('rx', [a], Math.PI / 2)];
    default:
      return null;
  }
}

const onlyGates = (list: readonly Statement[]): boolean => list.every(([kind]) => kind === 'gate');

/** One rewriting of the statement at a place that nobody can notice, or null where none of that kind fits. */
function rewriteAt(
  list: Statement[],
  at: number,
  dice: Dice,
  wires: number,
  programs: Kind,
  scratch: () => number,
): [string, number, Statement[]] | null {
  const here = list[at];
  const next = list[at + 1];
  const kind = dice.below(11);
  if (kind === 0) {
    const gate = randomGate(dice, wires, programs);
    const inverse: Gate = ['gate', ['inv', ...gate[1]], gate[2], gate[3], gate[4]];
    return ['gate and inverse', 0, [gate, inverse]];
  }
  if (!here) return null;
  if (kind === 1 && here[0] === 'reset') {
    const bit = scratch();
    const flip: Statement = ['if', ['bit', bit], [plain('x', [here[1]])], []];
    return ['reset by a condition', 1, [['measure', here[1], bit], flip]];
  }
  if (kind === 2 && here[0] === 'if') {
    const [, condition, then, otherwise] = here;
    if (otherwise.length === 0) return null;
    return ['branches exchanged', 1, [['if', ['not', condition], otherwise, then]]];
  }
  if (kind === 3 && next && areApart(here, next)) return ['order', 2, [next, here]];
  if (kind === 4 && here[0] === 'measure') {
    const [, wire, bit] = here;
    const x = plain('x', [wire]);
    return ['flip before and after', 1, [x, here, ['assign', bit, ['not', ['bit', bit]]], x]];
  }
  if (kind === 5 && here[0] === 'gate') {
    const other = respelled(here);
    return other && ['another spelling', 1, other];
  }
  if (kind <= 7 && here[0] === 'measure' && next?.[0] === 'if') {
    const [, condition, [gate, ...more], otherwise] = next;
    const isPlain = condition[0] === 'bit' && condition[1] === here[2];
    if (!isPlain || more.length > 0 || otherwise.length > 0 || gate?.[0] !== 'gate') return null;
    if (gate[4].includes(here[1])) return null;
    const control: Gate = ['gate', ['ctrl', ...gate[1]], gate[2], gate[3], [here[1], ...gate[4]]];
    return ['measurement deferred', 2, [control, here]];
  }
  if (kind === 7 && here[0] === 'measure') {
    return ['measured twice', 1, [['measure', here[1], scratch()], here]];
  }
  if (kind === 8 && here[0] === 'if' && onlyGates([...here[2], ...here[3]])) {
    const parts = here[2].map((s): Statement => ['if', here[1], [s], []]);
    const others: Statement[] = here[3].length > 0 ? [['if', ['not', here[1]], here[3], []]] : [];
    return ['conditions apart', 1, [...parts, ...others]];
  }
  if (kind === 9 && here[0] === 'if') {
    const bit = scratch();
    const chosen: Statement = ['if', ['bit', bit], here[2], here[3]];
    return ['condition kept in a bit', 1, [['assign', bit, here[1]], chosen]];
  }
  if (kind === 10 && here[0] === 'measure' && next?.[0] === 'reset' && next[1] === here[1]) {
    const turned = [plain('rz', [here[1]], angleOf(dice)), here, plain('h', [here[1]]), next];
    return ['what a reset forgets', 2, turned as Statement[]];
  }
  if (kind === 10 && here[0] === 'assign' && here[2][0] === 'xor') {
    const bit = scratch();
    const [, a, b] = here[2];
    const parts: Statement[] = [
      ['assign', bit, a],
      ['assign', here[1], ['xor', b, ['bit', bit]]],
    ];
    return ['parity in two steps', 1, parts];
  }
  return null;
}

/** An equal program: `count` rewritings at random places. */
export function rewritten(
  program: readonly Statement[],
  dice: Dice,
  wires: number,
  count: number,
  programs: Kind = 'any',
): { program: Statement[]; bits: number; rules: string[] } {
  const copy = structuredClone(program) as Statement[];
  const rules: string[] = [];
  let bits = BITS;
  for (let tries = 0; rules.length < count && tries < 400; tries++) {
    const list = dice.pick(listsOf(copy));
    const at = dice.below(list.length + 1);
    const before = bits;
    const change = rewriteAt(list, at, dice, wires, programs, () => bits++);
    // scratch bits in a branch that is not taken stay as they were: they are written before they are read
    if (!change || bits > BITS + 4) {
      bits = before;
      continue;
    }
    const [rule, taken, put] = change;
    list.splice(at, taken, ...put.map((s) => structuredClone(s)));
    rules.push(rule);
  }
  return { program: copy, bits, rules };
}

/** Some slips in a row; it may still be an equal program. */
export function spoiled(
  program: readonly Statement[],
  dice: Dice,
  wires: number,
  count: number,
): { program: Statement[]; slip: string } {
  let out = { program: [...program], slip: '' };
  for (let k = 0; k < count; k++) {
    const { program: next, slip } = slipIn(out.program, dice, wires);
    out = { program: next, slip: out.slip === '' ? slip : `${out.slip}, ${slip}` };
  }
  return out;
}

function slipIn(
  program: readonly Statement[],
  dice: Dice,
  wires: number,
): { program: Statement[]; slip: string } {
  for (;;) {
    const copy = structuredClone(program) as Statement[];
    const list = dice.pick(listsOf(copy));
    const at = dice.below(list.length);
    const here = list[at];
    if (!here) continue;
    const kind = dice.below(7);
    if (kind === 0) {
      list.splice(at, 1);
      return { program: copy, slip: `${here[0]} lost` };
    }
    if (kind === 1 && here[0] === 'gate' && here[3].length > 0) {
      here[3][0]! += dice.pick([0.3, -0.3, 1]);
      return { program: copy, slip: 'angle' };
    }
    if (kind === 2 && here[0] === 'gate' && here[4].length > 1) {
      here[4].reverse();
      return { program: copy, slip: 'operands exchanged' };
    }
    if (kind === 3 && here[0] === 'if') {
      here[1] = ['not', here[1]];
      return { program: copy, slip: 'condition negated' };
    }
    if (kind === 4 && (here[0] === 'measure' || here[0] === 'assign')) {
      here[here[0] === 'measure' ? 2 : 1] = dice.below(BITS);
      return { program: copy, slip: 'another bit' };
    }
    if (kind === 5 && (here[0] === 'measure' || here[0] === 'reset')) {
      here[1] = dice.below(wires);
      return { program: copy, slip: 'another wire' };
    }
    if (kind === 6 && list[at + 1]) {
      list.splice(at, 2, list[at + 1]!, here);
      return { program: copy, slip: 'order' };
    }
  }
}
