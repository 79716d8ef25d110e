/**
 * Narrows a circuit by structure alone: no gate is made anew, they are only put in another order.
 *
 * Used, each can be switched off: commutation, early measurement, and the rules at the boundary
 * (`survey/boundary.ts`).
 * The order in which outputs leave is planned for the fewest wires; with `wires` above that number, fewer
 * wires are used again and the circuit is less deep. Among the schedules tried the least deep is taken.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import type { StructureRules } from '../survey/early.ts';
import type { NarrowedCircuit } from './assemble.ts';
import { bestAt } from './frontier.ts';
import { planStructure } from './structure-plan.ts';

export type { NarrowedCircuit } from './assemble.ts';

export type NarrowingOptions = {
  /** Use this many wires if it can be done with so few; undefined: the fewest. */
  wires?: number;
  /** Rules to switch off: `{ early: false }`. */
  rules?: Partial<StructureRules>;
};

/** The circuit on `options.wires` wires, or on the fewest that structure allows when that is more. */
export function narrowByStructure(
  original: Circuit,
  contract: Contract,
  options: NarrowingOptions = {},
): NarrowedCircuit {
  const plan = planStructure(original, contract, options.rules);
  return bestAt(plan, options.wires ?? plan.width.width).narrowed;
}
