/**
 * Narrows through windows: each window becomes a chain of blocks along the order in which the whole needs its outputs, its
 * blocks become gates, and the circuit with these gates in the windows' place is planned like any other.
 *
 * Windows and their orders: `plan/windows.ts`. Result: the plan of the circuit with the new gates, and the fits, their wires in
 * the numbers of the circuit's carriers; null when a window could not be fitted to `FITTED` or the work was stopped.
 */
import { type GateOperation, type Operation, onWires } from '../circuit/circuit.ts';
import type { StructurePlan } from '../plan/structure-plan.ts';
import { type Replacement, type Window, withWindows } from '../plan/windows.ts';
import type { FitRow, WindowRow } from '../reports.ts';
import { carriersOfOutputs, factorChain } from './chain.ts';
import { type FitChainOptions, fitChain } from './fit-chain.ts';

/** A fitted window must come this near, in D: far below any tolerance, above rounding. */
const FITTED = 1e-20;

export type ReshapedWindows = { plan: StructurePlan; fits: FitRow[]; windows: WindowRow[] };

export async function reshapeWindows(
  plan: StructurePlan,
  windows: readonly Window[],
  /** `finish` turns the fitted gates of a window on `wires` wires into the gates to write. */
  options: FitChainOptions & { finish(operations: readonly GateOperation[], wires: number): GateOperation[] }, // biome-ignore format: one line
): Promise<ReshapedWindows | null> {
  const replacements: Replacement[] = [];
  const fits: FitRow[] = [];
  const rows: WindowRow[] = [];
  for (const window of windows) {
    const { unitary, carriers, order, needs } = window;
    const chain = factorChain(unitary, carriers.length, { order, needs });
    const { operations, fits: fitted, distance } = await fitChain(unitary, chain, options);
    if (!(distance <= FITTED) || options.control?.stopped()) return null;
    for (const row of fitted) {
      fits.push({ ...row, block: fits.length, wires: row.wires.map((wire) => carriers[wire]!) });
    }
    const finished = options.finish(operations, carriers.length);
    rows.push({
      wires: carriers,
      gates: { before: window.nodes.length, after: finished.length },
      entanglers: { before: window.nodes.filter((node) => isEntangler(plan.structure.circuit.nodes[node]!.operation)).length, after: finished.filter(isEntangler).length }, // biome-ignore format: one pair
    });
    replacements.push({
      operations: onWires(finished, carriers),
      places: carriersOfOutputs(chain).map((carrier) => carriers[carrier]!),
    });
  }
  return { plan: withWindows(plan, windows, replacements), fits, windows: rows };
}

function isEntangler(operation: Operation | null | undefined): boolean {
  return operation?.kind === 'gate' && operation.wires.length > 1;
}
