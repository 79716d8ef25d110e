/**
 * Two small jobs for a page: a text read and drawn, and the trade between wires and depth of a circuit by
 * structure. Both are plain data in and out, so they run wherever jobs run.
 */
import type { Circuit } from './circuit/circuit.ts';
import { wireName } from './circuit/circuit.ts';
import { contractOf } from './circuit/contract.ts';
import { type Counts, countCircuit } from './circuit/counts.ts';
import { type CommonOptions, readSource, type Source } from './commands.ts';
import { type Contract, contractName } from './contract.ts';
import type { Control } from './control.ts';
import type { Device } from './device/device.ts';
import { estimateSuccess } from './device/estimate.ts';
import type { InputProblem } from './input-error.ts';
import type { Job } from './jobs.ts';
import { frontier } from './plan/frontier.ts';
import { narrowAlong, planStructure } from './plan/structure-plan.ts';
import { readDevice } from './read/device.ts';
import type { TradePoint } from './write/frontier-picture.ts';
import { circuitPicture, isSimplified, type PictureOptions } from './write/picture.ts';

export type DrawJob = Job & {
  kind: 'draw';
  source: Source;
  options: CommonOptions;
  picture: PictureOptions;
};

export type Drawing = {
  svg: string;
  /** Drawn as strokes: nothing in it can be linked to the text. */
  isSimplified: boolean;
  wireNames: string[];
  contract: Contract;
  contractName: string;
  counts: Counts;
  warnings: InputProblem[];
};

/** Reads a circuit or unitary and draws it. Throws InputError with all problems of the text. */
export async function drawSource({ source, options, picture }: DrawJob): Promise<Drawing> {
  const warnings: InputProblem[] = [];
  const circuit = await readSource(source, options.nearest === true, warnings, []);
  const contract = contractOf(circuit, options);
  return {
    svg: circuitPicture(circuit, picture),
    isSimplified: isSimplified(circuit),
    wireNames: Array.from({ length: circuit.wires }, (_, wire) => wireName(circuit, wire)),
    contract,
    contractName: contractName(contract),
    counts: countCircuit(circuit),
    warnings,
  };
}

export type TradeJob = Job & { kind: 'trade'; source: Source; options: CommonOptions };

export type Trade = {
  /** By structure, early measurement and commutation; fewest wires first. */
  points: TradePoint[];
  /** The circuit as it was written. */
  written: TradePoint;
};

/** The least deep plan for each number of wires, with its estimated success where a device is given. */
export async function tradeOf({ source, options }: TradeJob, control: Control): Promise<Trade> {
  const circuit = await readSource(source, options.nearest === true, [], []);
  const device = options.device && readDevice(options.device.text, options.device.name);
  const pointOf = (made: Circuit): TradePoint => ({
    wires: made.wires,
    depth: countCircuit(made).depth,
    success: successOf(made, device),
  });
  const plan = planStructure(circuit, contractOf(circuit, options));
  const points = frontier(plan, { stopped: control.stopped }).map(({ wires, depth, order }) => ({
    wires,
    depth,
    success: device ? successOf(narrowAlong(plan, order, wires).circuit, device) : null,
  }));
  return { points, written: pointOf(circuit) };
}

function successOf(circuit: Circuit, device: Device | undefined): number | null {
  if (!device || circuit.wires > device.wires.length) return null;
  return estimateSuccess(circuit, device).success;
}
