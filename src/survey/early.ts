/**
 * The relation with everything that the contract allows without changing what the gates do: commutation, early
 * measurement, and the rules at the boundary.
 *
 * Early measurement: the trailing gates on a measured output that only control or put a phase there may come
 * after its measurement, as conditions on the bit. Such a gate still waits for the bit, so the order between
 * outcomes is kept: whoever needs the gate needs the measured wire to have entered before.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { type AxisFinder, axisFinder } from './axes.ts';
import { type BoundaryRules, type Simplified, simplifyBoundary } from './boundary.ts';
import { wireRelation } from './light-cones.ts';
import { livesOf } from './lives.ts';
import { closureRelation, type OrderRules } from './order.ts';
import type { Relation } from './relation.ts';

export type StructureRules = OrderRules & BoundaryRules;

export const ALL_RULES: StructureRules = Object.freeze({
  commute: true,
  early: true,
  zero: true,
  dead: true,
  xor: true,
});

export type StructureOfLives = Simplified & {
  /** Carriers x carriers. */
  relation: Relation;
  axesOf: AxisFinder;
};

/** Carriers, simplified, with the relation between them. */
export function structureOf(
  circuit: Circuit,
  contract: Contract,
  rules: StructureRules = ALL_RULES,
): StructureOfLives {
  const axesOf = axisFinder();
  const simplified = simplifyBoundary(livesOf(circuit, contract), rules, axesOf);
  return { ...simplified, axesOf, relation: closureRelation(simplified.circuit, rules, axesOf) };
}

/** Which inputs must have entered before each output leaves, all rules used: wires x wires. */
export function earlyRelation(circuit: Circuit, contract: Contract): Relation {
  const { circuit: lives, relation } = structureOf(circuit, contract);
  return wireRelation(lives, relation, circuit.wires);
}
