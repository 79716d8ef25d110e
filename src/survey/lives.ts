/**
 * Turns a circuit into carriers: one per stretch of a wire between two resets, so that reuse can be planned
 * anew.
 *
 * A carrier brings one input of the original (or a fresh |0> after a reset), is acted on, and ends as one
 * output of the original (or just before a reset). Swaps only rename carriers. Barriers keep no order here:
 * they cost nothing and change nothing.
 * Convention: carrier k < wires brings input k; carriers of later resets follow. Operations act on carriers.
 */
import {
  bitsRead,
  type Circuit,
  type GateOperation,
  moved,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';
import type { Contract, OutputRule } from '../contract.ts';

export type Life = {
  /** Input of the original, or -1 for a fresh |0>. */
  input: number;
  /** Output of the original, or -1 when it ends before a reset. */
  output: number;
  startsInZero: boolean;
  rule: OutputRule;
  /** Bit its last measurement writes; -1 when it has none of its own in the file. */
  bit: number;
};

/** An operation on carriers, or the end of a carrier (`end` >= 0); a measurement of the file may be an end. */
export type LifeNode = { operation: Operation | null; end: number; window?: LifeWindow };

/** Several gates taken as one, of which is known which of its outputs need which of its inputs. */
export type LifeWindow = {
  carriers: readonly number[];
  /** needs[k]: places in `carriers` whose input the k-th carrier needs. */
  needs: readonly (readonly number[])[];
};

export type LifeCircuit = {
  lives: readonly Life[];
  nodes: readonly LifeNode[];
  /** Bits of the original circuit. */
  bits: number;
  /** How many barriers were left out. */
  barriers: number;
};

/** True for a plain swap, which moves qubits and does nothing else. */
export function isSwap(operation: Operation): operation is GateOperation {
  return (
    operation.kind === 'gate' &&
    operation.name === 'swap' &&
    operation.controls.length === 0 &&
    operation.power === 1 &&
    operation.condition === undefined
  );
}

export function livesOf(circuit: Circuit, contract: Contract): LifeCircuit {
  const { wires, bits } = circuit;
  const lives: Life[] = contract.inputs.map((rule, input) => ({
    input,
    output: -1,
    startsInZero: rule === 'zero',
    rule: 'dropped',
    bit: -1,
  }));
  const carrierOf = Int32Array.from({ length: wires }, (_, wire) => wire);
  const lastNode: number[] = new Array(wires).fill(-1);
  /** Carriers that a swap has moved since their last operation: what was measured into a bit is then an outcome by itself. */
  const isMoved = new Set<number>();
  const nodes: LifeNode[] = [];
  let barriers = 0;
  for (const operation of circuit.operations) {
    if (operation.kind === 'barrier') {
      barriers++;
      continue;
    }
    if (isSwap(operation)) {
      const [a, b] = operation.wires as [number, number]; // a swap has two operands
      [carrierOf[a], carrierOf[b]] = [carrierOf[b]!, carrierOf[a]!];
      isMoved.add(carrierOf[a]!).add(carrierOf[b]!);
      continue;
    }
    if (operation.kind === 'reset' && !operation.condition) {
      const old = carrierOf[operation.wire]!;
      const isUntouched = lastNode[old] === -1 && lives[old]!.startsInZero;
      if (isUntouched) continue;
      endBeforeReset(lives[old]!, nodes, lastNode[old]!, old);
      carrierOf[operation.wire] = lives.length;
      lives.push({ input: -1, output: -1, startsInZero: true, rule: 'dropped', bit: -1 });
      lastNode.push(-1);
      continue;
    }
    const carried = moved(operation, (wire) => carrierOf[wire]!);
    for (const carrier of operationWires(carried)) {
      lastNode[carrier] = nodes.length;
      isMoved.delete(carrier);
    }
    nodes.push({ operation: carried, end: -1 });
  }
  for (let wire = 0; wire < wires; wire++) {
    const carrier = carrierOf[wire]!;
    const life = lives[carrier]!;
    life.output = wire;
    life.rule = contract.outputs[wire]!;
    if (!(isMoved.has(carrier) && life.rule === 'measured'))
      endLife(life, nodes, lastNode[carrier]!, carrier);
  }
  const ended = new Set(nodes.map(({ end }) => end));
  lives.forEach((_, carrier) => {
    if (!ended.has(carrier)) nodes.push({ operation: null, end: carrier });
  });
  return { lives, nodes, bits, barriers };
}

function endBeforeReset(life: Life, nodes: LifeNode[], last: number, carrier: number): void {
  const operation = nodes[last]?.operation;
  if (operation?.kind !== 'measure' || operation.condition) return;
  life.rule = operation.bit >= 0 ? 'measured' : 'dropped';
  endLife(life, nodes, last, carrier);
}

/** Makes the last measurement of a life its end. */
function endLife(life: Life, nodes: LifeNode[], last: number, carrier: number): void {
  const operation = nodes[last]?.operation;
  if (operation?.kind !== 'measure' || operation.condition) return;
  if (life.rule === 'measured' && operation.bit >= 0) {
    life.bit = operation.bit;
    nodes[last] = { operation, end: carrier };
  } else if (life.rule === 'dropped' && operation.bit < 0) {
    // its outcome is thrown away, and so is the qubit
    nodes[last] = { operation: null, end: carrier };
  }
}

/** The bits that one measurement at the end of a life writes, and that nothing else writes or reads. */
export function privateBits({ lives, nodes, bits }: LifeCircuit): Uint8Array {
  const uses = new Uint8Array(bits);
  const bump = (bit: number): void => {
    uses[bit] = Math.min(2, uses[bit]! + 1);
  };
  for (const { operation } of nodes) {
    if (!operation) continue;
    for (const bit of bitsRead(operation)) uses[bit] = 2;
    if ((operation.kind === 'measure' || operation.kind === 'assign') && operation.bit >= 0) {
      bump(operation.bit);
    }
  }
  const out = new Uint8Array(bits);
  for (const { bit } of lives) if (bit >= 0 && uses[bit] === 1) out[bit] = 1;
  return out;
}
