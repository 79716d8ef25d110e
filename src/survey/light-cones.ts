/**
 * Light cones: which inputs each output can depend on, from the gates alone.
 *
 * Output i needs input j when a path of operations leads from j to i, in the order in which they are written.
 * Swaps only rename; barriers are no paths; a reset cuts its wire (after it the wire carries a fresh |0>); a
 * condition is a path from the measured wire to the gate. Outputs and inputs are the circuit's wires.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { axisFinder } from './axes.ts';
import { type LifeCircuit, livesOf } from './lives.ts';
import { closureRelation } from './order.ts';
import { emptyRelation, type Relation, relate, relates } from './relation.ts';

/** Which inputs each output needs when gates keep their order: wires x wires. */
export function structuralRelation(circuit: Circuit): Relation {
  const lives = livesOf(circuit, keptContract(circuit.wires));
  const asWritten = { commute: false, early: false };
  return wireRelation(lives, closureRelation(lives, asWritten, axisFinder()), circuit.wires);
}

/** The rows and columns of a relation between lives that are outputs and inputs of the original. */
export function wireRelation({ lives }: LifeCircuit, relation: Relation, wires: number): Relation {
  const out = emptyRelation(wires, wires);
  lives.forEach(({ output }, carrier) => {
    if (output < 0) return;
    for (let input = 0; input < wires; input++) {
      // carrier k < wires brings input k
      if (relates(relation, carrier, input)) relate(out, output, input);
    }
  });
  return out;
}

function keptContract(wires: number): Contract {
  return {
    inputs: new Array(wires).fill('any'),
    outputs: new Array(wires).fill('kept'),
    decidedBy: 'options',
  };
}
