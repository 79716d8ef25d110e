/**
 * The part of a survey that looks beyond structure: dense influence where a matrix is possible, probes with
 * states beyond, and windows of a few wires at any size.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { circuitUnitary } from '../circuit/unitary.ts';
import type { Contract } from '../contract.ts';
import { freeRunning } from '../control.ts';
import { ALL_RULES, structureOf } from './early.ts';
import { INFLUENCE_WIRES_MAX, influenceFloor, influenceTables } from './influence.ts';
import { structuralRelation, wireRelation } from './light-cones.ts';
import { PROBE_FLOOR, PROBE_WIRES_MAX, probeTables } from './probes.ts';
import { emptyRelation, type Relation, relate } from './relation.ts';
import type { SurveyOptions } from './survey-options.ts';
import { unitaryPart } from './unitary-part.ts';
import { planWidth, type WidthPlan } from './width.ts';
import { chooseWindows } from './windows.ts';

const PROBE_WIRES_DEFAULT = 16;
/** Larger circuits are not searched for windows by a survey. */
const WINDOW_OPERATIONS_MAX = 5000;

export type CausalPart = { relation: Relation; plan: WidthPlan };

export type InfluencePart = {
  method: 'dense' | 'probes';
  kept: Float64Array;
  measured: Float64Array;
  keptFloor: number;
  measuredFloor: number;
};

export function surveyInfluence(
  circuit: Circuit,
  options: SurveyOptions,
  notes: string[],
): InfluencePart | null {
  const { seed = 1, control = freeRunning, probeWiresMax = PROBE_WIRES_DEFAULT } = options;
  const n = circuit.wires;
  const part = unitaryPart(circuit);
  if (!part) {
    notes.push('no influence table: the circuit measures, resets or decides on the way');
    return null;
  }
  if (n <= INFLUENCE_WIRES_MAX) {
    control.report({ stage: 'measuring influence' });
    const tables = influenceTables(circuitUnitary(part), n, structuralRelation(part));
    const keptFloor = influenceFloor(n);
    return { method: 'dense', ...tables, keptFloor, measuredFloor: Math.sqrt(keptFloor) };
  }
  if (n > Math.min(probeWiresMax, PROBE_WIRES_MAX)) {
    notes.push(
      `no influence table: a dense one is possible up to ${INFLUENCE_WIRES_MAX} wires, probes up to ${PROBE_WIRES_MAX}`,
    );
    return null;
  }
  const { kept, measured, probes } = probeTables(part, { seed, control });
  notes.push(
    `influence by ${probes} probes: entries are half the largest change seen of the output's state (trace distance); what was not seen is not proved absent`,
  );
  return { method: 'probes', kept, measured, keptFloor: PROBE_FLOOR, measuredFloor: PROBE_FLOOR };
}

/** Row by row: what counts for this output under the contract. */
export function shownTable({ kept, measured }: InfluencePart, contract: Contract): Float64Array {
  const n = contract.outputs.length;
  return kept.map((value, at) =>
    contract.outputs[Math.floor(at / n)] === 'kept' ? value : measured[at]!,
  );
}

export function causalPart(
  influence: InfluencePart,
  contract: Contract,
  n: number,
): { relation: Relation; plan: WidthPlan } {
  const relation = emptyRelation(n, n);
  for (let output = 0; output < n; output++) {
    const isKept = contract.outputs[output] === 'kept';
    const table = isKept ? influence.kept : influence.measured;
    const floor = isKept ? influence.keptFloor : influence.measuredFloor;
    for (let input = 0; input < n; input++) {
      if (table[output * n + input]! > floor) relate(relation, output, input);
    }
  }
  return { relation, plan: planWidth(relation) };
}

/**
 * What windows of a few wires allow for kept outputs and any input; null when none lowers the width, or when
 * there are too many operations to search.
 */
export function windowsPart(circuit: Circuit, options: SurveyOptions): CausalPart | null {
  const { control = freeRunning } = options;
  if (circuit.operations.length > WINDOW_OPERATIONS_MAX) return null;
  control.report({ stage: 'looking for windows' });
  const anyKept: Contract = {
    inputs: new Array(circuit.wires).fill('any'),
    outputs: new Array(circuit.wires).fill('kept'),
    decidedBy: 'options',
  };
  const order = { commute: true, early: false };
  const structure = structureOf(circuit, anyKept, { ...ALL_RULES, ...order });
  const structural = planWidth(structure.relation);
  const found = chooseWindows(structure, structural, {
    rules: order,
    stopped: () => control.stopped(),
  });
  if (found.width.width >= structural.width) return null;
  const count = found.windows.length === 1 ? 'one window' : `${found.windows.length} windows`;
  return {
    relation: wireRelation(structure.circuit, found.relation, circuit.wires),
    plan: { ...found.width, exact: false, method: `influence in ${count} of at most 4 wires` },
  };
}
