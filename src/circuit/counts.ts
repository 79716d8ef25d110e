/**
 * Counts what a circuit costs. Depth is the critical path in gates, measurements and resets, each costing
 * one; barriers order operations but cost nothing, and so do classical assignments. A condition makes an
 * operation wait for the measurements that wrote its bits.
 */
import { bitsRead, bitWritten, type Circuit, operationWires } from './circuit.ts';

export type Counts = {
  wires: number;
  bits: number;
  oneQubit: number;
  /** Gates on two wires or more (`largerGates` of them on three or more). */
  twoQubit: number;
  largerGates: number;
  depth: number;
  twoQubitDepth: number;
  measurements: number;
  resets: number;
};

export function countCircuit(circuit: Circuit): Counts {
  const { wires, bits, operations } = circuit;
  const counts: Counts = {
    wires,
    bits,
    oneQubit: 0,
    twoQubit: 0,
    largerGates: 0,
    depth: 0,
    twoQubitDepth: 0,
    measurements: 0,
    resets: 0,
  };
  // a level per wire, then per bit; depth counts everything, twoQubitDepth only gates on two or more wires
  const level = new Int32Array(wires + bits);
  const entanglerLevel = new Int32Array(wires + bits);
  for (const operation of operations) {
    const operands = operationWires(operation);
    const touched = [...operands, ...bitsRead(operation).map((bit) => wires + bit)];
    const written = bitWritten(operation);
    if (written >= 0) touched.push(wires + written);
    const isGate = operation.kind === 'gate';
    const isEntangler = isGate && operands.length >= 2;
    if (isGate && operands.length === 1) counts.oneQubit++;
    if (isEntangler) counts.twoQubit++;
    if (isGate && operands.length > 2) counts.largerGates++;
    if (operation.kind === 'measure') counts.measurements++;
    if (operation.kind === 'reset') counts.resets++;
    const isFree = operation.kind === 'barrier' || operation.kind === 'assign';
    let top = 0;
    let entanglerTop = 0;
    for (const slot of touched) {
      top = Math.max(top, level[slot]!);
      entanglerTop = Math.max(entanglerTop, entanglerLevel[slot]!);
    }
    if (!isFree && touched.length > 0) top++;
    if (isEntangler) entanglerTop++;
    for (const slot of touched) {
      level[slot] = top;
      entanglerLevel[slot] = entanglerTop;
    }
    counts.depth = Math.max(counts.depth, top);
    counts.twoQubitDepth = Math.max(counts.twoQubitDepth, entanglerTop);
  }
  return counts;
}
