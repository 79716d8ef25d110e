/**
 * Rewrites a circuit along a chain of blocks: factor, turn blocks into gates, put everything in order of time.
 *
 * Result: events over carriers; blocks that were not fitted are gates with matrices, for exact synthesis.
 */

import { assert } from '../assert.ts';
import type { Operation } from '../circuit/circuit.ts';
import type { WireEvent } from '../plan/assemble.ts';
import type { FitRow } from '../reports.ts';
import { chainEvents, feedForwardEvents } from './chain-events.ts';
import { factorFeedForward } from './feed-forward.ts';
import { type FitChainOptions, fitBlockAlone, fitChain } from './fit-chain.ts';
import type { Road } from './road.ts';

export type Reshaped = { events: WireEvent[]; fits: FitRow[] };

/**
 * Rewrites along a road that the matrix opened; null when a road with feed-forward needs too many variants of
 * its blocks. `bitOf(output)` is the bit a measured output goes into.
 */
export async function reshape(
  road: Road & { kind: 'chain' | 'feed-forward' },
  bitOf: (output: number) => number,
  options: FitChainOptions,
): Promise<Reshaped | null> {
  const { u, wires, measured } = road.question;
  if (road.kind === 'chain') {
    const { chain } = road.attempt;
    const { operations, fits } = await fitChain(u, chain, options);
    return { events: chainEvents(chain, operations), fits };
  }
  const steps = factorFeedForward(u, wires, road.plan, measured);
  if (!steps) return null;
  const fits: FitRow[] = [];
  const events: WireEvent[] = [];
  for (const event of feedForwardEvents(steps, bitOf)) {
    if (event.kind !== 'operation' || !isLarge(event.operation)) events.push(event);
    else events.push(...(await fittedBlock(event.operation, fits, options)));
  }
  return { events, fits };
}

function isLarge(operation: Operation): boolean {
  return operation.kind === 'gate' && operation.wires.length > 2;
}

async function fittedBlock(
  operation: Operation,
  fits: FitRow[],
  options: FitChainOptions,
): Promise<WireEvent[]> {
  assert(operation.kind === 'gate' && operation.matrix !== undefined, () => 'a block is a matrix');
  const { matrix, wires, condition } = operation;
  const block = await fitBlockAlone({ matrix, wires }, fits.length, options);
  if (!block) return [{ kind: 'operation', operation }];
  fits.push(block.fit);
  return block.operations.map((gate) => ({
    kind: 'operation',
    operation: condition ? { ...gate, condition } : gate,
  }));
}
