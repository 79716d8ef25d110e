/**
 * Finds the angles with which a template makes a circuit that is already written in its entanglers.
 *
 * Shape: gates on one wire, and uses of the entangler at the template's places in its order; nothing adjustable.
 * Method: from the end to the beginning, the product of a wire's gates after an entangler is taken apart in the two rotations
 * that the template has there and a third one about the axis that passes the entangler, R2(b) R1(a) Rp(c), p the axis of
 * R2; the third one goes to the other side of the entangler. Where the template has three rotations all stay.
 * Result: the angles in the template's order, right up to a phase; undefined for templates of another form.
 */
import type { GateOperation } from '../circuit/circuit.ts';
import { gateMatrix } from '../circuit/unitary.ts';
import { identity, mul } from '../numeric/complex-matrix.ts';
import type { Template } from '../reshape/template.ts';
import { type Axis, axisAngles, rotationMatrix } from './axis-angles.ts';

export function templateAngles(
  operations: readonly GateOperation[],
  template: Template,
  signOf: (side: 0 | 1) => 1 | -1,
): Float64Array | undefined {
  const { wires, steps } = template;
  if (steps.some((step) => step.kind === 'entangler' && step.angle === 'free')) return undefined;
  // the runs between entanglers, wire by wire
  const runs: Float64Array[][] = Array.from({ length: wires }, () => [identity(2)]);
  for (const operation of operations) {
    for (const wire of operation.wires) {
      const list = runs[wire]!;
      if (operation.wires.length > 1) list.push(identity(2));
      else list.push(mul(gateMatrix(operation), list.pop()!, 2));
    }
  }
  const angles: number[] = [];
  const at = (wire: number): number => runs[wire]!.length - 1;
  // groups of rotations of one wire, from the end
  for (let k = steps.length - 1; k >= 0; ) {
    const step = steps[k]!;
    if (step.kind === 'entangler') {
      k--;
      continue;
    }
    const axes: Axis[] = [];
    const { wire } = step;
    for (; k >= 0; k--) {
      const other = steps[k]!;
      if (other.kind !== 'rotation' || other.wire !== wire) break;
      axes.unshift(other.axis);
    }
    const run = runs[wire]!.pop();
    if (!run) return undefined;
    const last = axes[axes.length - 1]!;
    const inner = axes[axes.length - 2];
    if (inner === undefined) return undefined;
    const [c, a, b] = axisAngles(run, last, inner);
    if (axes.length === 3) angles.unshift(c, a, b);
    else {
      angles.unshift(a, b);
      const before = at(wire);
      if (before < 0) return undefined;
      // the use of the entangler that stands before this run says on which side the wire is
      const side = sideOf(steps, k, wire);
      const moved = rotationMatrix(last, side === undefined ? c : signOf(side) * c);
      runs[wire]![before] = mul(moved, runs[wire]![before]!, 2);
    }
  }
  return runs.every((list) => list.length === 0) ? Float64Array.from(angles) : undefined;
}

function sideOf(steps: Template['steps'], from: number, wire: number): 0 | 1 | undefined {
  for (let k = from; k >= 0; k--) {
    const step = steps[k]!;
    if (step.kind === 'entangler') return step.wires[0] === wire ? 0 : 1;
  }
  return undefined;
}
