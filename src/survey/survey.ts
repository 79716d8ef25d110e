/**
 * Measures how many wires a circuit really needs: by structure, by structure and early measurement, and by
 * influence, with one row for each contract.
 *
 * Where a dense matrix is possible (`INFLUENCE_WIRES_MAX` wires, nothing measured or reset on the way)
 * influence is exact; beyond, up to `options.probeWiresMax` wires, it is probed with states; else only
 * structure is told.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { contractOf } from '../circuit/contract.ts';
import { countCircuit } from '../circuit/counts.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { type Contract, contractName } from '../contract.ts';
import { freeRunning } from '../control.ts';
import type { HowSure, Pair, SurveyReport, WidthRow } from '../reports.ts';
import { bestStructure } from './best-structure.ts';
import { structuralRelation } from './light-cones.ts';
import { livesOf } from './lives.ts';
import { closureRelation } from './order.ts';
import { type Relation, relates, relationFromTable, relationMatrix } from './relation.ts';
import { STATE_WIDTH_WIRES_MAX, stateWidth } from './state-width.ts';
import {
  type CausalPart,
  causalPart,
  type InfluencePart,
  shownTable,
  surveyInfluence,
  windowsPart,
} from './survey-influence.ts';
import type { SurveyOptions } from './survey-options.ts';
import { unitaryPart } from './unitary-part.ts';
import { planWidth, type WidthPlan } from './width.ts';

export type { SurveyOptions } from './survey-options.ts';

/** Above this the rows of the report's tables are left out. */
const TABLE_WIRES_MAX = 400;

export function surveyCircuit(circuit: Circuit, options: SurveyOptions = {}): SurveyReport {
  const { seed = 1, control = freeRunning } = options;
  const contract = contractOf(circuit, options);
  const notes: string[] = [];
  control.report({ stage: 'following the light cones' });
  const structure = surveyStructure(circuit, contract, notes);
  const influence = surveyInfluence(circuit, options, notes);
  const whole = influence && causalPart(influence, contract, circuit.wires);
  const windows =
    whole && whole.plan.width >= structure.plan.width ? null : windowsPart(circuit, options);
  const causal = whole ?? windows;
  if (windows) {
    notes.push(`${windows.plan.method} would leave ${count(windows.plan.width)} for any input`);
  }
  const widths = widthRows(circuit, contract, structure, influence, windows);
  addContractNotes(circuit, contract, notes);
  return {
    schema: 'wiregauge/survey@1',
    seed,
    contract: contractName(contract),
    contractFromFile: contract.decidedBy === 'file',
    seconds: 0,
    notes,
    circuit: circuit.name,
    counts: countCircuit(circuit),
    structure: {
      ...planPart(structure.plan),
      reach: circuit.wires > TABLE_WIRES_MAX ? [] : relationMatrix(structure.reach),
      pairs: circuit.wires > TABLE_WIRES_MAX ? [] : freePairs(structure.reach),
    },
    early: structure.early && planPart(structure.early),
    influence: influence && {
      method: influence.method,
      kind: contract.outputs.some((rule) => rule === 'kept') ? 'kept' : 'measured',
      table: rows(shownTable(influence, contract), circuit.wires),
    },
    causal: causal && { ...planPart(causal.plan), pairs: freePairs(causal.relation) },
    openings: causal ? openings(structure.reach, causal.relation) : [],
    widths,
    ...(influence?.method === 'dense' ? { approximate: prices(influence, circuit.wires) } : {}),
  };
}

type StructurePart = {
  reach: Relation;
  plan: WidthPlan;
  commuted: WidthPlan;
  /** With early measurement and the rules at the boundary; null when nothing is measured or dropped. */
  early: WidthPlan | null;
};

function surveyStructure(circuit: Circuit, contract: Contract, notes: string[]): StructurePart {
  const reach = structuralRelation(circuit);
  const kept: Contract = { ...contract, outputs: contract.outputs.map(() => 'kept') };
  const lives = livesOf(circuit, kept);
  const isPlain = lives.lives.length === circuit.wires;
  const asWritten = { commute: false, early: false };
  const plan = planWidth(isPlain ? reach : closureRelation(lives, asWritten));
  const anyKept: Contract = { ...kept, inputs: kept.inputs.map(() => 'any') };
  const commuted = bestStructure(circuit, anyKept).width;
  if (commuted.width < plan.width) {
    notes.push(`gates that commute, put in another order, need ${count(commuted.width)}`);
  }
  if (lives.barriers > 0) notes.push('barriers are not counted as order between gates');
  const isLoose =
    contract.outputs.some((rule) => rule !== 'kept') || contract.inputs.includes('zero');
  const early = isLoose ? bestStructure(circuit, contract).width : null;
  return { reach, plan, commuted, early };
}

function widthRows(
  circuit: Circuit,
  contract: Contract,
  structure: StructurePart,
  influence: InfluencePart | null,
  windows: CausalPart | null,
): WidthRow[] {
  const n = circuit.wires;
  const out: WidthRow[] = [];
  const byOrder = Math.min(structure.plan.width, structure.commuted.width);
  if (influence?.method === 'dense') {
    const { kept, keptFloor } = influence;
    const { width } = planWidth(relationFromTable(kept, n, keptFloor));
    const why = `by influence: no equal circuit has fewer than ${count(width)}, and a chain of blocks has as many`;
    out.push({ contract: 'any/kept', width, how: 'exact', why });
  } else if (windows && windows.plan.width < byOrder) {
    const { width, method } = windows.plan;
    const why = `by ${method}; other circuits may need fewer`;
    out.push({ contract: 'any/kept', width, how: sure(width), why });
  } else {
    const why = 'by the order of the gates; other circuits may need fewer';
    out.push({ contract: 'any/kept', width: byOrder, how: sure(byOrder), why });
  }
  out.push(measuredRow(circuit, byOrder, influence));
  const state = zeroRow(circuit, byOrder);
  if (state) out.push(state);
  if (contract.inputs.every((rule) => rule === 'zero') && structure.early) {
    const { width } = structure.early;
    const why = 'by the order of the gates, early measurement and what has no effect at the ends';
    out.push({ contract: 'program', width, how: sure(width), why });
  }
  return out;
}

/** One wire is the least there is. */
function sure(width: number): HowSure {
  return width <= 1 ? 'exact' : 'upper';
}

function measuredRow(circuit: Circuit, byOrder: number, influence: InfluencePart | null): WidthRow {
  const n = circuit.wires;
  const contract = contractOf(circuit, { inputs: 'any', outputs: 'measured' });
  const early = Math.min(byOrder, bestStructure(circuit, contract).width.width);
  const causal =
    influence?.method === 'dense'
      ? planWidth(relationFromTable(influence.measured, n, influence.measuredFloor)).width
      : early;
  const width = Math.min(early, causal);
  const how = sure(width);
  if (how === 'exact') {
    const why = 'one wire, measured and used again, with conditions on the bits';
    return { contract: 'any/measured', width, how, why };
  }
  const road = causal < early ? 'by influence on the bits' : 'by early measurement';
  const why = `${road}; combining bits afterwards may allow fewer`;
  return { contract: 'any/measured', width, how, why };
}

/** Inputs zero, outputs kept: by the Schmidt ranks of the state, where it can be computed. */
function zeroRow(circuit: Circuit, byOrder: number): WidthRow | null {
  const n = circuit.wires;
  const part = unitaryPart(circuit);
  if (!part || n < 1) return null;
  if (n > STATE_WIDTH_WIRES_MAX) {
    const why = `by the order of the gates; Schmidt ranks are computed up to ${STATE_WIDTH_WIRES_MAX} wires`;
    return { contract: 'zero/kept', width: byOrder, how: sure(byOrder), why };
  }
  const state = new Float64Array(2 ** (n + 1));
  state[0] = 1;
  for (const operation of part.operations) {
    if (operation.kind === 'gate') applyGateInto(state, operation, n, 1);
  }
  const { width, prices: fewer } = stateWidth(state, n);
  const cost = fewer.map(
    ({ wires, infidelityAtLeast }) =>
      `; ${count(wires)}: infidelity at least ${infidelityAtLeast.toPrecision(3)}`,
  );
  const ground = 'by the Schmidt ranks of the state, which rest on a classical simulation';
  const why = ground + cost.join('');
  return { contract: 'zero/kept', width, how: 'exact', why };
}

/**
 * For each smaller number of wires the least threshold at which forgetting weaker influence makes the width
 * small enough: every circuit with so few wires must be without one influence at least that strong.
 */
function prices(
  { kept, keptFloor }: InfluencePart,
  n: number,
): { wires: number; infidelityAtLeast: number }[] {
  const exact = planWidth(relationFromTable(kept, n, keptFloor)).width;
  const levels = [...new Set([...kept].filter((x) => x > keptFloor))].sort((a, b) => a - b);
  const out: { wires: number; infidelityAtLeast: number }[] = [];
  for (let wires = exact - 1; wires >= 1; wires--) {
    let [low, high] = [0, levels.length - 1];
    while (low < high) {
      const middle = (low + high) >> 1;
      const { width } = planWidth(relationFromTable(kept, n, levels[middle]!));
      if (width <= wires) high = middle;
      else low = middle + 1;
    }
    out.push({ wires, infidelityAtLeast: levels[low]! });
  }
  return out;
}

function addContractNotes(circuit: Circuit, contract: Contract, notes: string[]): void {
  if (contract.decidedBy === 'file') {
    const isProgram = contract.inputs.includes('zero');
    notes.push(
      isProgram
        ? 'the file measures: inputs zero, measured outputs measured, the others dropped'
        : 'the file does not measure: inputs any, outputs kept',
    );
  }
  const kinds = new Set(contract.outputs);
  if (kinds.size > 1) {
    notes.push(
      'influence: rows of kept outputs bound the infidelity, the others the error of a bit',
    );
  }
  const idle = new Set(Array.from({ length: circuit.wires }, (_, k) => k));
  for (const operation of circuit.operations) {
    if (operation.kind !== 'gate') continue;
    for (const wire of operation.wires) idle.delete(wire);
  }
  if (idle.size > 0) notes.push(`${count(idle.size)} without any gate`);
}

function planPart(plan: WidthPlan): { width: number; method: string; how: HowSure } {
  return { width: plan.width, method: plan.method, how: plan.exact ? 'exact' : 'upper' };
}

function rows(table: Float64Array, n: number): number[][] {
  return Array.from({ length: n }, (_, k) => [...table.subarray(k * n, (k + 1) * n)]);
}

function freePairs(relation: Relation): Pair[] {
  const out: Pair[] = [];
  for (let leaves = 0; leaves < relation.outputs; leaves++) {
    for (let enters = 0; enters < relation.inputs; enters++) {
      if (!relates(relation, leaves, enters)) out.push({ leaves, enters });
    }
  }
  return out;
}

function openings(structure: Relation, causal: Relation): Pair[] {
  return freePairs(causal).filter(({ leaves, enters }) => relates(structure, leaves, enters));
}

function count(wires: number): string {
  return wires === 1 ? 'one wire' : `${wires} wires`;
}
