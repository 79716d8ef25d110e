/**
 * Takes neighbouring gates together where the whole commutes with more than its parts: CX, Rz, CX is one ZZ
 * rotation, a ladder of CX around an Rz is a product of Zs, a Toffoli in CX and T is a control on two wires.
 *
 * From each gate on, along a set of carriers, gates join one after the other (as windows grow,
 * `window-search.ts`, forward only, so the block is convex); the first block whose matrix has an axis on every
 * carrier, while some carrier had gates of different axes in it, is taken as one gate. Again on the result, so
 * blocks of blocks are found. Tested by matrices, not by names.
 * A block is emitted as the gates it was made of. It happens in one piece, so it is only taken where every
 * output of it needed every input anyway.
 * Cost: for each gate a few sets of carriers, for each a few small matrices. Limit: `BLOCK_NODES_MAX`
 * operations.
 */
import { type GateOperation, operationWires, unitaryGate } from '../circuit/circuit.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { identity } from '../numeric/complex-matrix.ts';
import { type Axis, type AxisFinder, axisOn, sameAxis } from './axes.ts';
import { contracted } from './contracted.ts';
import type { LifeCircuit, LifeNode } from './lives.ts';
import { carrierSets, growForward, isGate, linesOf } from './window-search.ts';

/** Larger circuits are planned gate by gate. */
export const BLOCK_NODES_MAX = 20000;
const BLOCK_WIRES_MAX = 3;
const BLOCK_GATES_MAX = 16;
const SETS_MAX = 6;
const ROUNDS_MAX = 4;
const LABEL = 'gates taken together';

/** Blocks in place of gates; the same circuit when there are none. */
export function mergeBlocks(circuit: LifeCircuit, axesOf: AxisFinder): LifeCircuit {
  if (circuit.nodes.length > BLOCK_NODES_MAX) return circuit;
  let current = circuit;
  for (let round = 0; round < ROUNDS_MAX; round++) {
    const next = mergeOnce(current, axesOf);
    if (next === current) break;
    current = next;
  }
  return current;
}

/** The gates a block was made of; any other gate is itself. */
export function unmerged(gate: GateOperation): GateOperation[] {
  if (gate.label !== LABEL || !gate.definition) return [gate];
  return gate.definition.operations.flatMap((part) =>
    unmerged({ ...part, wires: part.wires.map((wire) => gate.wires[wire]!) }),
  );
}

type Block = { nodes: number[]; carriers: number[]; needs: number[][]; gate: GateOperation };

function mergeOnce(circuit: LifeCircuit, axesOf: AxisFinder): LifeCircuit {
  const lines = linesOf(circuit);
  const taken = new Uint8Array(circuit.nodes.length);
  const blocks: Block[] = [];
  circuit.nodes.forEach((node, start) => {
    if (taken[start] || !isGate(node)) return;
    if (operationWires(node.operation).length > BLOCK_WIRES_MAX) return;
    for (const carriers of carrierSets(circuit, lines, start, BLOCK_WIRES_MAX, SETS_MAX)) {
      const nodes = growForward(circuit, lines, start, carriers, BLOCK_GATES_MAX, taken);
      const block = firstBlock(circuit, nodes, axesOf);
      if (!block) continue;
      blocks.push(block);
      for (const member of block.nodes) taken[member] = 1;
      break;
    }
  });
  if (blocks.length === 0) return circuit;
  const whole = contracted(circuit, blocks);
  if (!whole) return circuit;
  const gateOf = new Map(blocks.map(({ needs, gate }) => [needs as unknown, gate]));
  const nodes = whole.nodes.map((node): LifeNode => {
    const gate = node.window && gateOf.get(node.window.needs);
    return gate ? { operation: gate, end: -1 } : node;
  });
  return { ...whole, nodes };
}

/** The shortest beginning of the nodes that is a block. */
function firstBlock(
  circuit: LifeCircuit,
  nodes: readonly number[],
  axesOf: AxisFinder,
): Block | null {
  const carriers = [
    ...new Set(nodes.flatMap((node) => [...operationWires(circuit.nodes[node]!.operation!)])),
  ].sort((a, b) => a - b);
  const n = carriers.length;
  const matrix = identity(2 ** n);
  const gates: GateOperation[] = [];
  // per carrier: the axis of its gates so far, `none` where they differ
  const common = new Map<number, Axis>();
  let isMixed = false;
  for (const [k, node] of nodes.entries()) {
    const { operation } = circuit.nodes[node]!;
    if (operation?.kind !== 'gate') return null;
    const wires = operation.wires.map((carrier) => carriers.indexOf(carrier));
    const local = { ...operation, wires };
    applyGateInto(matrix, local, n, 2 ** n);
    gates.push(local);
    axesOf(operation).forEach((axis, place) => {
      const wire = wires[place]!;
      const before = common.get(wire);
      const agrees = before === undefined || (axis !== 'none' && sameAxis(before, axis));
      if (!agrees) isMixed = true;
      common.set(wire, agrees ? axis : 'none');
    });
    if (!isMixed || k < 2 || operation.wires.length + common.size < 3) continue;
    const used = [...common.keys()].sort((a, b) => a - b);
    const gains = used.some((wire) => common.get(wire) === 'none');
    if (!gains || !isTied(gates, used)) continue;
    if (used.some((wire) => axisOn(matrix, n, wire) === 'none')) continue;
    return blockOf(nodes.slice(0, k + 1), gates, used, carriers);
  }
  return null;
}

/** Does every output of the gates need every input? */
function isTied(gates: readonly GateOperation[], wires: readonly number[]): boolean {
  const cone = new Map(wires.map((wire) => [wire, 1 << wire]));
  for (const gate of gates) {
    const all = gate.wires.reduce((sum, wire) => sum | cone.get(wire)!, 0);
    for (const wire of gate.wires) cone.set(wire, all);
  }
  const whole = wires.reduce((sum, wire) => sum | (1 << wire), 0);
  return [...cone.values()].every((set) => set === whole);
}

function blockOf(
  nodes: number[],
  gates: readonly GateOperation[],
  used: readonly number[],
  carriers: readonly number[],
): Block {
  const n = used.length;
  const operations = gates.map((gate) => ({
    ...gate,
    wires: gate.wires.map((wire) => used.indexOf(wire)),
  }));
  const matrix = identity(2 ** n);
  for (const gate of operations) applyGateInto(matrix, gate, n, 2 ** n);
  const own = used.map((wire) => carriers[wire]!);
  const gate = {
    ...unitaryGate(matrix, own, LABEL),
    definition: { operations, phase: 0 },
  };
  const places = own.map((_, k) => k);
  return { nodes, carriers: own, needs: own.map(() => places), gate };
}
