/**
 * The unitary of a circuit whose measurements all come last on their wires.
 */
import type { Circuit, GateOperation } from '../circuit/circuit.ts';
import { circuitUnitary } from '../circuit/unitary.ts';

/** The circuit less its final measurements; null when it measures, resets or decides before its end. */
export function unitaryPart(circuit: Circuit): Circuit | null {
  const gates: GateOperation[] = [];
  const ended = new Set<number>();
  for (const operation of circuit.operations) {
    if (operation.kind === 'barrier') continue;
    if (operation.condition || operation.kind === 'reset' || operation.kind === 'assign')
      return null;
    if (operation.kind === 'measure') {
      if (ended.has(operation.wire)) return null;
      ended.add(operation.wire);
    } else if (operation.wires.some((wire) => ended.has(wire))) return null;
    else gates.push(operation);
  }
  return { ...circuit, bits: 0, bitRegisters: [], operations: gates };
}

/** Its matrix, or null when there is none or the circuit has more wires than `wiresMax`. */
export function unitaryOf(circuit: Circuit, wiresMax: number): Float64Array | null {
  if (circuit.wires > wiresMax || circuit.wires === 0) return null;
  const part = unitaryPart(circuit);
  return part ? circuitUnitary(part) : null;
}
