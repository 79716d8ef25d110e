/**
 * Takes away what has no effect because of how a circuit begins and ends.
 *
 * - `zero`: a gate that only controls on, or puts a phase on, a carrier still in |0> (or |1>) loses that wire.
 * - `dead`: a gate at the very end of carriers that are measured (where it is a mere control or phase) or
 *   dropped changes no probability, and goes.
 * - `xor`: a final permutation gate (CX, Toffoli) whose wires are all measured becomes a classical assignment
 *   to the target's bit after all measurements.
 * Sound because a gate that goes commutes with all that stays behind it: it shares their axis on every common
 * carrier (`axes.ts`). Bits that are written or read elsewhere are left alone.
 */
import {
  type AssignOperation,
  type BitExpression,
  type GateOperation,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';
import { type Axis, type AxisFinder, axisFinder, isZ, sameAxis, Z_AXIS } from './axes.ts';
import { type LifeCircuit, type LifeNode, privateBits } from './lives.ts';
import { RESTRICT_WIRES_MAX, restrictGate } from './restrict.ts';

export type BoundaryRules = { zero: boolean; dead: boolean; xor: boolean };

export type Simplified = {
  circuit: LifeCircuit;
  /** Classical statements to make after everything else, in order. */
  assignments: readonly AssignOperation[];
  /** How often each rule was used. */
  used: { zero: number; dead: number; xor: number };
};

export function simplifyBoundary(
  circuit: LifeCircuit,
  rules: BoundaryRules,
  axesOf: AxisFinder = axisFinder(),
): Simplified {
  const used = { zero: 0, dead: 0, xor: 0 };
  let nodes = circuit.nodes;
  if (rules.zero) nodes = forward(circuit, nodes, axesOf, used);
  const assignments: AssignOperation[] = [];
  if (rules.dead || rules.xor) {
    nodes = backward({ ...circuit, nodes }, rules, axesOf, used, assignments);
  }
  return { circuit: { ...circuit, nodes }, assignments, used };
}

/** Values of carriers that are still basis states; -1 when they are not. */
function forward(
  { lives }: LifeCircuit,
  nodes: readonly LifeNode[],
  axesOf: AxisFinder,
  used: Simplified['used'],
): LifeNode[] {
  const value = Int8Array.from(lives, ({ startsInZero }) => (startsInZero ? 0 : -1));
  const out: LifeNode[] = [];
  for (const node of nodes) {
    const { operation, end } = node;
    if (!operation || end >= 0 || operation.kind !== 'gate') {
      if (operation?.kind === 'reset') value[operation.wire] = -1;
      out.push(node);
      continue;
    }
    const rest = withoutKnown(operation, value, axesOf);
    if (rest !== operation) used.zero++;
    if (!rest) continue;
    out.push(rest === operation ? node : { operation: rest, end });
    const flips = rest.name === 'x' && rest.wires.length === 1 && rest.power === 1;
    for (const carrier of rest.wires) {
      if (flips && !rest.condition && value[carrier]! >= 0) value[carrier] = 1 - value[carrier]!;
      else value[carrier] = -1;
    }
  }
  return out;
}

function withoutKnown(
  operation: GateOperation,
  value: Int8Array,
  axesOf: AxisFinder,
): GateOperation | null {
  let rest = operation;
  for (let place = 0; place < rest.wires.length; ) {
    const known = value[rest.wires[place]!]!;
    const isOwn = place >= rest.controls.length;
    const canRestrict = !isOwn || rest.wires.length <= RESTRICT_WIRES_MAX;
    if (known < 0 || !canRestrict || !isZ(axesOf(rest)[place]!)) {
      place++;
      continue;
    }
    const less = rest.wires.length === 1 ? null : restrictGate(rest, place, known === 1);
    if (!less) return null;
    rest = less;
    place = 0;
  }
  return rest;
}

/** What may still come before the end of a carrier without being noticed. */
type Tail =
  /**
   * Nothing that stays has acted yet, counted from the end; what acts along `axis` goes unnoticed (null:
   * anything).
   */
  { axis: Axis | null; isBare: boolean } | 'closed';

function backward(
  circuit: LifeCircuit,
  rules: BoundaryRules,
  axesOf: AxisFinder,
  used: Simplified['used'],
  assignments: AssignOperation[],
): LifeNode[] {
  const { lives, nodes } = circuit;
  const isPrivate = privateBits(circuit);
  const tails: Tail[] = lives.map(({ rule }) =>
    rule === 'kept' ? 'closed' : { axis: rule === 'measured' ? Z_AXIS : null, isBare: true },
  );
  const out: LifeNode[] = [];
  for (let k = nodes.length - 1; k >= 0; k--) {
    const node = nodes[k]!;
    const { operation, end } = node;
    if (!operation || end >= 0) {
      out.push(node);
      continue;
    }
    const axes = axesOf(operation);
    if (rules.dead && operation.kind === 'gate' && isUnnoticed(operation, axes, tails)) {
      used.dead++;
      continue;
    }
    const assignment = rules.xor ? asAssignment(operation, axes, tails, circuit, isPrivate) : null;
    if (assignment) {
      used.xor++;
      assignments.unshift(assignment);
      continue;
    }
    operationWires(operation).forEach((carrier, place) => {
      tails[carrier] = tailBefore(tails[carrier]!, axes[place]!);
    });
    out.push(node);
  }
  return out.reverse();
}

function isUnnoticed(operation: Operation, axes: readonly Axis[], tails: readonly Tail[]): boolean {
  return operationWires(operation).every((carrier, place) => {
    const tail = tails[carrier]!;
    return tail !== 'closed' && (tail.axis === null || sameAxis(tail.axis, axes[place]!));
  });
}

function tailBefore(tail: Tail, axis: Axis): Tail {
  if (tail === 'closed' || axis === 'all') return tail;
  if (axis === 'none') return 'closed';
  if (tail.axis === null) return { axis, isBare: false };
  return sameAxis(tail.axis, axis) ? { axis: tail.axis, isBare: false } : 'closed';
}

/** `c[t] = c[t] ^ (c[a] & c[b])` for a final X on t controlled by a and b, all measured. */
function asAssignment(
  operation: Operation,
  axes: readonly Axis[],
  tails: readonly Tail[],
  { lives }: LifeCircuit,
  isPrivate: Uint8Array,
): AssignOperation | null {
  if (operation.kind !== 'gate' || operation.condition || operation.power !== 1) return null;
  const own = OWN_CONTROLS.get(operation.name);
  if (own === undefined) return null;
  const { wires, controls } = operation;
  const bits = wires.map((carrier) => lives[carrier]!.bit);
  const isFree = wires.every((carrier, place) => {
    const tail = tails[carrier]!;
    const { rule, bit } = lives[carrier]!;
    if (rule !== 'measured' || bit < 0 || !isPrivate[bit] || tail === 'closed') return false;
    return place === wires.length - 1 ? tail.isBare : isZ(axes[place]!);
  });
  if (!isFree) return null;
  const target: BitExpression = { kind: 'bit', bit: bits.at(-1)! };
  const conditions = bits.slice(0, -1).map((bit, place): BitExpression => {
    const isOn = controls[place] ?? true;
    return isOn ? { kind: 'bit', bit } : { kind: 'not', of: { kind: 'bit', bit } };
  });
  const value: BitExpression =
    conditions.length === 0
      ? { kind: 'not', of: target }
      : { kind: 'xor', of: [target, allOf(conditions)] };
  return { kind: 'assign', bit: target.bit, value };
}

function allOf(conditions: readonly BitExpression[]): BitExpression {
  return conditions.length === 1 ? conditions[0]! : { kind: 'and', of: conditions };
}

/** Gates that flip their last wire when all others are 1, and how many others there are. */
const OWN_CONTROLS: ReadonlyMap<string, number> = new Map([
  ['x', 0],
  ['cx', 1],
  ['CX', 1],
  ['ccx', 2],
  ['c3x', 3],
  ['c4x', 4],
]);
