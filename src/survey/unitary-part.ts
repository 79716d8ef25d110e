/** The gates of a circuit whose measurements all come last on their wires. */
import type { Circuit, GateOperation } from '../circuit/circuit.ts';

/**
 * The circuit less its final measurements and barriers; null when it measures, resets or decides before its
 * end.
 */
export function unitaryPart(circuit: Circuit): Circuit | null {
  const gates: GateOperation[] = [];
  const ended = new Set<number>();
  const touched = new Set<number>();
  for (const operation of circuit.operations) {
    if (operation.kind === 'barrier') continue;
    if (operation.condition || operation.kind === 'assign') return null;
    if (operation.kind === 'reset') {
      // before anything else has happened on a wire a reset only says that it starts in |0>
      if (touched.has(operation.wire)) return null;
      continue;
    }
    if (operation.kind === 'measure') {
      if (ended.has(operation.wire)) return null;
      ended.add(operation.wire);
      continue;
    }
    if (operation.wires.some((wire) => ended.has(wire))) return null;
    for (const wire of operation.wires) touched.add(wire);
    gates.push(operation);
  }
  return { ...circuit, bits: 0, bitRegisters: [], operations: gates };
}
