/**
 * Puts the gates of a chain in the order in which they can happen: inputs enter as late as the chain allows,
 * outputs leave as early as they can.
 *
 * Method: gates come in one list over all carriers. At each stage the inputs enter, then every gate whose
 * carriers are there, and whose earlier gates on the same carriers are done, is emitted; outputs leave last.
 */
import { assert } from '../assert.ts';
import { type GateOperation, type Operation, unitaryGate } from '../circuit/circuit.ts';
import type { WireEvent } from '../plan/assemble.ts';
import type { Chain } from './chain.ts';
import type { BitValue, FeedStep } from './feed-forward.ts';

/** Events of a chain whose blocks have become `operations` on carriers, in any order of blocks that fits. */
export function chainEvents(chain: Chain, operations: readonly GateOperation[]): WireEvent[] {
  const events: WireEvent[] = [];
  const present = new Set<number>();
  let pending = [...operations];
  for (const { enters, leaves } of chain.stages) {
    for (const input of enters) {
      present.add(input);
      events.push({ kind: 'enter', input, carrier: input });
    }
    const held = new Set<number>();
    const later: GateOperation[] = [];
    for (const operation of pending) {
      const isReady = operation.wires.every((wire) => present.has(wire) && !held.has(wire));
      if (isReady) events.push({ kind: 'operation', operation });
      else {
        later.push(operation);
        for (const wire of operation.wires) held.add(wire);
      }
    }
    pending = later;
    for (const { output, carrier } of leaves) {
      assert(!held.has(carrier), () => `output ${output} would leave before its last gate`);
      events.push({ kind: 'leave', output, carrier });
      present.delete(carrier);
    }
  }
  assert(pending.length === 0, () => `${pending.length} gates of a chain found no time to happen`);
  return events;
}

/** The blocks of a chain as gates with matrices: exact, for the native room to take apart. */
export function blockOperations(chain: Chain): GateOperation[] {
  return chain.stages.flatMap(({ blocks }) =>
    blocks.map(({ wires, matrix }) => unitaryGate(matrix, wires, 'block')),
  );
}

/**
 * Events of a factorisation with feed-forward. `bitOf(output)` is the bit into which a measured output goes.
 */
export function feedForwardEvents(
  steps: readonly FeedStep[],
  bitOf: (output: number) => number,
): WireEvent[] {
  return steps.map((step): WireEvent => {
    if (step.kind === 'enter') return { kind: 'enter', input: step.input, carrier: step.input };
    if (step.kind === 'leave') return step;
    const { wires, matrix, when } = step;
    return {
      kind: 'operation',
      operation: onCondition(unitaryGate(matrix, wires, 'block'), when, bitOf),
    };
  });
}

function onCondition(
  operation: GateOperation,
  when: readonly BitValue[],
  bitOf: (output: number) => number,
): Operation {
  if (when.length === 0) return operation;
  const parts = when.map(({ output, value }) => {
    const bit = { kind: 'bit' as const, bit: bitOf(output) };
    return value === 1 ? bit : { kind: 'not' as const, of: bit };
  });
  const [first, ...others] = parts;
  const condition = others.length > 0 ? { kind: 'and' as const, of: parts } : first!;
  return { ...operation, condition };
}
