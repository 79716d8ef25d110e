/** What a comparison asks, and what every road answers. */
import type { Circuit } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { distanceAngle, processInfidelity } from '../numeric/distance.ts';
import type { CompareReport, DistanceReport } from '../reports.ts';

export type Question = {
  original: Circuit;
  rewritten: Circuit;
  contract: Contract;
  tolerance: number;
  relabel: boolean;
  seed: number;
};

export type Answer = Pick<
  CompareReport & { unfoldedWires: number },
  | 'verdict'
  | 'distance'
  | 'phase'
  | 'method'
  | 'proof'
  | 'witness'
  | 'relabelling'
  | 'notes'
  | 'unfoldedWires'
>;

export function undecided(why: string): Answer {
  return {
    verdict: 'undecided',
    distance: null,
    phase: null,
    method: 'none',
    proof: false,
    witness: null,
    relabelling: null,
    notes: [why],
    unfoldedWires: 0,
  };
}

/** All four measures from D; the worst case where it is known. */
export function distances(
  hilbertSchmidt: number,
  errorBar: number | null,
  worstCase: number | null = null,
): DistanceReport & { errorBar: number | null } {
  return {
    hilbertSchmidt,
    processInfidelity: processInfidelity(hilbertSchmidt),
    worstCase,
    angle: distanceAngle(hilbertSchmidt),
    errorBar,
  };
}
