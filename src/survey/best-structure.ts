/**
 * Structure with or without gates taken together, whichever needs fewer wires, and its plan.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { mergeBlocks } from './blocks.ts';
import { simplifyBoundary } from './boundary.ts';
import { ALL_RULES, type StructureOfLives, type StructureRules, structureOf } from './early.ts';
import { closureRelation } from './order.ts';
import type { Relation } from './relation.ts';
import { planWidth, type WidthPlan } from './width.ts';

export type BestStructure = {
  structure: StructureOfLives;
  width: WidthPlan;
  /** Some gates were taken together because the whole commutes with more. */
  isMerged: boolean;
};

export function bestStructure(
  circuit: Circuit,
  contract: Contract,
  rules: StructureRules = ALL_RULES,
): BestStructure {
  const plain = structureOf(circuit, contract, rules);
  const width = planWidth(plain.relation);
  const isDone = width.width <= 1 || !rules.commute;
  const merged = isDone ? plain : withBlocks(plain, rules);
  if (merged === plain || isSame(plain.relation, merged.relation)) {
    return { structure: plain, width, isMerged: false };
  }
  const mergedWidth = planWidth(merged.relation);
  return mergedWidth.width < width.width
    ? { structure: merged, width: mergedWidth, isMerged: true }
    : { structure: plain, width, isMerged: false };
}

function isSame({ rows }: Relation, other: Relation): boolean {
  return rows.every((row, k) => row.every((word, w) => word === other.rows[k]![w]));
}

/**
 * With gates taken together where the whole commutes with more; the same object when there is nothing to take.
 */
function withBlocks(plain: StructureOfLives, rules: StructureRules): StructureOfLives {
  const { axesOf } = plain;
  const merged = mergeBlocks(plain.circuit, axesOf);
  if (merged === plain.circuit) return plain;
  const ends = { zero: false, dead: rules.dead, xor: false };
  const { circuit, used } = simplifyBoundary(merged, ends, axesOf);
  return {
    ...plain,
    circuit,
    used: { ...plain.used, dead: plain.used.dead + used.dead },
    relation: closureRelation(circuit, rules, axesOf),
  };
}
