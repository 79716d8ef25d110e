/** The two annotations of narrowed circuits: which qubit a wire takes up, and which it gives away. */
import type { Circuit } from '../circuit/circuit.ts';

const ENTERS = /^wiregauge\.enters\s+(\d+)\s*$/;
const LEAVES = /^wiregauge\.leaves\s+(\d+)\s*$/;

type Annotated = { annotations?: readonly string[] };

function numberIn({ annotations }: Annotated, pattern: RegExp): number {
  for (const line of annotations ?? []) {
    const match = pattern.exec(line);
    if (match) return Number(match[1]);
  }
  return -1;
}

/** The input that enters at this operation, or -1. */
export function entering(operation: Annotated): number {
  return numberIn(operation, ENTERS);
}

/** The output that leaves at this operation, or -1. */
export function leaving(operation: Annotated): number {
  return numberIn(operation, LEAVES);
}

/** True when the circuit says which qubits its wires carry. */
export function isAnnotated(circuit: Circuit): boolean {
  return circuit.operations.some(
    (operation) => entering(operation) >= 0 || leaving(operation) >= 0,
  );
}
