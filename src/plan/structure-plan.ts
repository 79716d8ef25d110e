/**
 * Plans a circuit by structure: carriers, their order, and the order of outputs with the fewest wires; and
 * makes the circuit of any order of outputs.
 */
import type { AssignOperation, Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { bestStructure } from '../survey/best-structure.ts';
import { ALL_RULES, type StructureOfLives, type StructureRules } from '../survey/early.ts';
import { closureRelation, orderGraph } from '../survey/order.ts';
import type { WidthPlan } from '../survey/width.ts';
import { assembleWires, type NarrowedCircuit } from './assemble.ts';
import { type Schedule, type SchedulePlan, schedule } from './schedule.ts';

export type StructurePlan = {
  original: Circuit;
  contract: Contract;
  structure: StructureOfLives;
  scheduling: SchedulePlan;
  width: WidthPlan;
  notes: string[];
};

/** Everything that does not depend on the number of wires. */
export function planStructure(
  original: Circuit,
  contract: Contract,
  rules: Partial<StructureRules> = {},
): StructurePlan {
  const all = { ...ALL_RULES, ...rules };
  const { structure, width, isMerged } = bestStructure(original, contract, all);
  const { circuit, relation, axesOf } = structure;
  const bitOf = (carrier: number): number => {
    const { bit, output } = circuit.lives[carrier]!;
    return bit >= 0 ? bit : original.bits + output;
  };
  const notes = rulesUsed(structure);
  if (isMerged) notes.push('commutation: some neighbouring gates taken together');
  if (all.commute && usesCommutation(structure, all)) {
    notes.push('commutation: gates that commute may come in another order');
  }
  return {
    original,
    contract,
    structure,
    scheduling: { circuit, relation, graph: orderGraph(circuit, all, axesOf), bitOf },
    width,
    notes,
  };
}

/** True when the order as written would tie more carriers. */
function usesCommutation(
  { circuit, relation, axesOf }: StructureOfLives,
  rules: StructureRules,
): boolean {
  const asWritten = closureRelation(circuit, { ...rules, commute: false }, axesOf);
  return asWritten.rows.some((row, k) => row.some((word, w) => word !== relation.rows[k]![w]));
}

/**
 * The circuit in which outputs leave in the given order, on at most `wires` wires (as many as the order needs).
 */
export function narrowAlong(
  plan: StructurePlan,
  order: readonly number[],
  wires: number,
): NarrowedCircuit {
  const { events, conditions } = schedule(plan.scheduling, order, wires);
  return assembled(plan, { events, conditions }, wires);
}

function assembled(plan: StructurePlan, found: Schedule, wires: number): NarrowedCircuit {
  const { original, contract, structure, notes } = plan;
  const rules = [...notes];
  if (found.conditions > 0) {
    const what = found.conditions === 1 ? 'one gate' : `${found.conditions} gates`;
    rules.push(`early measurement: ${what} after a measurement, as conditions on its bit`);
  }
  const narrowed = assembleWires(found.events, original, contract, { wires, rules });
  return withAssignments(narrowed, structure.assignments);
}

function withAssignments(
  { circuit, ...rest }: NarrowedCircuit,
  assignments: readonly AssignOperation[],
): NarrowedCircuit {
  const operations = [...circuit.operations, ...assignments];
  return { ...rest, circuit: { ...circuit, operations } };
}

function rulesUsed({ used, circuit }: StructureOfLives): string[] {
  const gates = (count: number): string => (count === 1 ? 'one gate' : `${count} gates`);
  const notes: string[] = [];
  if (used.zero > 0) notes.push(`start in |0>: ${gates(used.zero)} simplified or left out`);
  if (used.dead > 0) notes.push(`no effect on any outcome: ${gates(used.dead)} left out`);
  if (used.xor > 0) {
    notes.push(`before measurements: ${gates(used.xor)} done on the bits instead`);
  }
  if (circuit.barriers > 0) notes.push('barriers left out');
  return notes;
}
