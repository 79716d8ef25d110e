/**
 * The main job: rewrites a circuit so that it needs fewer wires, in native gates, checks the written text, and
 * says why when it cannot be done.
 *
 * Order of preference: what structure allows (reordering, early measurement, boundary rules), because it keeps
 * the gates as they were written; windows of a few gates that are reshaped, which keeps all others; a chain of blocks
 * when the matrix allows fewer wires still; within a tolerance the nearest chain; else the bound that says why not.
 */
import { compareCircuits } from './check/compare.ts';
import type { Circuit, Operation } from './circuit/circuit.ts';
import { contractOf } from './circuit/contract.ts';
import { countCircuit } from './circuit/counts.ts';
import { type Contract, type ContractOptions, contractName } from './contract.ts';
import { type Control, freeRunning } from './control.ts';
import type { Device } from './device/device.ts';
import { estimateSuccess } from './device/estimate.ts';
import { InputError } from './input-error.ts';
import type { RunJobs } from './jobs.ts';
import { MATRIX_WIRES_MAX } from './native/decompose.ts';
import { type NativeSet, nativeSetOf } from './native/native-set.ts';
import { toNative } from './native/to-native.ts';
import {
  assembleWires,
  bitOfOutput,
  type NarrowedCircuit,
  type WireEvent,
} from './plan/assemble.ts';
import { bestAt } from './plan/frontier.ts';
import { readCircuit } from './read/openqasm.ts';
import type { CompareReport, FitRow, NarrowReport, WindowRow } from './reports.ts';
import { reshape } from './reshape/reshape.ts';
import { chooseRoad, figures, type Road, type Wish } from './reshape/road.ts';
import { reshapeWindows } from './reshape/window-chains.ts';
import { writeCircuit } from './write/openqasm.ts';

export type NarrowOptions = ContractOptions & {
  /** How many wires are wanted; undefined: the fewest. */
  wires?: number;
  /** Native gates, `cx,rz,sx` unless given. */
  native?: string;
  /** Convert to native gates even where the gates could stay as they were written. */
  nativeAsked?: boolean;
  /** Entanglers of the caller's own, by name. */
  custom?: readonly { name: string; matrix: Float64Array }[];
  device?: Device;
  /** On the distance D; 1e-10 unless given. */
  tolerance?: number;
  seed?: number;
  runJobs: RunJobs;
  control?: Control;
};

export type Narrowed = {
  report: NarrowReport;
  /** OpenQASM 3; null when nothing was narrowed. */
  text: string | null;
  circuit: Circuit | null;
};

export const NARROW_DEFAULTS = Object.freeze({ native: 'cx,rz,sx', tolerance: 1e-10, seed: 1 });

/** Marks the barriers that are only there while gates are converted. */
const HANDED_ON = 'wiregauge.handed-on';
/** Fits stop being improved at this D: far below what anybody asks for, above rounding. */
const FIT_GOAL = 1e-13;

type Job = {
  original: Circuit;
  options: NarrowOptions;
  contract: Contract;
  native: NativeSet;
  tolerance: number;
  seed: number;
  control: Control;
  notes: string[];
};

type Gates = { narrowed: NarrowedCircuit; fits: FitRow[]; windows?: WindowRow[] };

type Rewritten = {
  narrowed: NarrowedCircuit;
  fits: FitRow[];
  windows: WindowRow[];
  text: string;
  check: CompareReport & { unfoldedWires: number };
};

/** See the header. The report's `seconds` is left at 0 and `files` empty: the shell knows them. */
export async function narrow(original: Circuit, options: NarrowOptions): Promise<Narrowed> {
  const job = settle(original, options);
  const { control, contract, tolerance, seed } = job;
  control.report({ stage: 'looking for a plan' });
  const wish = { circuit: original, contract, wires: options.wires, tolerance };
  const { road, rewriting } = await alongRoad(job, { ...wish, stopped: control.stopped });
  if (rewriting === null) return answer(job, road, null);
  if (typeof rewriting === 'string') return answer(job, closedAfterAll(road, rewriting), null);
  const { narrowed, fits, windows = [] } = rewriting;
  control.report({ stage: 'checking the written text' });
  const text = writeCircuit(narrowed.circuit);
  const { circuit } = readCircuit(text, narrowed.circuit.name);
  const check = compareCircuits(original, circuit, { contract: options, tolerance, seed });
  return answer(job, road, { narrowed: { ...narrowed, circuit }, fits, windows, text, check });
}

function settle(original: Circuit, options: NarrowOptions): Job {
  const { native, tolerance, seed } = { ...NARROW_DEFAULTS, ...options };
  const { wires } = options;
  if (wires !== undefined && !(Number.isInteger(wires) && wires >= 1)) {
    const message = `wires must be a whole number of at least 1, got ${wires}`;
    throw new InputError({ code: 'out-of-range', message });
  }
  if (!(tolerance > 0 && tolerance < 1)) {
    const message = `tolerance must be in (0, 1), got ${tolerance}`;
    throw new InputError({ code: 'out-of-range', message });
  }
  return {
    original,
    options,
    contract: contractOf(original, options),
    native: nativeSetOf(native, options.custom),
    tolerance,
    seed,
    control: options.control ?? freeRunning,
    notes: [],
  };
}

/** The road, and the narrower circuit along it: null where it is closed from the start, or why it is closed after all. */
async function alongRoad(
  job: Job,
  wish: Wish,
): Promise<{ road: Road; rewriting: Gates | string | null }> {
  const road = chooseRoad(wish);
  if (road.kind === 'impossible' || road.kind === 'undecided') return { road, rewriting: null };
  if (road.kind !== 'windows') return { road, rewriting: await rewrite(job, road) };
  const rewriting = await throughWindows(job, road);
  if (rewriting || wish.stopped()) return { road, rewriting: rewriting ?? 'but it was stopped' };
  job.notes.push('windows were found, but the gates for one of them were not');
  return alongRoad(job, { ...wish, withoutWindows: true });
}

/** The narrower circuit of a road that leads somewhere, or why the road turned out to be closed. */
async function rewrite(
  { original, contract, native, options, seed, control, notes }: Job,
  road: Road & { kind: 'structure' | 'chain' | 'feed-forward' },
): Promise<Gates | string> {
  if (road.kind === 'structure') {
    const { narrowed } = road;
    return {
      narrowed: options.nativeAsked ? inNativeGates(narrowed, contract, native) : narrowed,
      fits: [],
    };
  }
  const { runJobs } = options;
  const fit = { entangler: native.entangler, seed, goal: FIT_GOAL, runJobs, control };
  const reshaped = await reshape(road, (output) => bitOfOutput(original, contract, output), fit);
  if (!reshaped) return 'but its blocks would depend on too many bits at once';
  const unfitted = reshaped.events.flatMap(wiresOfUnfitted);
  if (unfitted.some((wires) => wires > MATRIX_WIRES_MAX)) {
    return `but one of its blocks has ${Math.max(...unfitted)} wires, and ${MATRIX_WIRES_MAX} is the limit for writing it in gates`;
  }
  if (unfitted.length > 0) notes.push(decomposedNote(unfitted, control.stopped()));
  const narrowed = assembleWires(reshaped.events, original, contract);
  return { narrowed: inNativeGates(narrowed, contract, native), fits: reshaped.fits };
}

/** The circuit with its windows reshaped; null when one of them could not be. */
async function throughWindows(
  { contract, native, options, seed, control }: Job,
  { plan, windows }: Road & { kind: 'windows' },
): Promise<Gates | null> {
  const reshaped = await reshapeWindows(plan, windows, {
    entangler: native.entangler,
    seed,
    goal: FIT_GOAL,
    runJobs: options.runJobs,
    control,
    finish: (operations, wires) => toNative(operations, wires, native).filter((operation) => operation.kind === 'gate'), // biome-ignore format: one line
  });
  if (!reshaped) return null;
  const { narrowed } = bestAt(reshaped.plan, options.wires ?? reshaped.plan.width.width);
  return {
    narrowed: options.nativeAsked ? inNativeGates(narrowed, contract, native) : narrowed,
    fits: reshaped.fits,
    windows: reshaped.windows,
  };
}

/**
 * The same circuit in native gates. A phase before a measurement does nothing to its bit and is left out by
 * `toNative`; where the measurement only stands for a kept qubit that is handed on, a barrier keeps it.
 */
function inNativeGates(
  narrowed: NarrowedCircuit,
  contract: Contract,
  native: NativeSet,
): NarrowedCircuit {
  const { circuit } = narrowed;
  const held = circuit.operations.flatMap((operation): Operation[] =>
    operation.kind === 'measure' && keptOutput(operation, contract)
      ? [{ kind: 'barrier', wires: [operation.wire], annotations: [HANDED_ON] }, operation]
      : [operation],
  );
  const operations = toNative(held, circuit.wires, native).filter(
    ({ kind, annotations }) => kind !== 'barrier' || !annotations?.includes(HANDED_ON),
  );
  return { ...narrowed, circuit: { ...circuit, operations } };
}

function keptOutput({ annotations }: Operation, contract: Contract): boolean {
  return (annotations ?? []).some((line) => {
    const match = /^wiregauge\.leaves (\d+)$/.exec(line);
    return match !== null && contract.outputs[Number(match[1])] === 'kept';
  });
}

/** Wires of a block of three or more that is still a matrix: native gates come from a decomposition, not from a fit. */
function wiresOfUnfitted(event: WireEvent): number[] {
  const { operation } = event.kind === 'operation' ? event : {};
  const isBlock = operation?.kind === 'gate' && operation.matrix !== undefined;
  return isBlock && operation.wires.length > 2 ? [operation.wires.length] : [];
}

function decomposedNote(unfitted: readonly number[], isStopped: boolean): string {
  const [most, blocks] = [Math.max(...unfitted), unfitted.length];
  const what = blocks === 1 ? `a block of ${most} wires was` : `${blocks} blocks of at most ${most} wires were`; // biome-ignore format: one choice
  const why = isStopped ? 'its time was over' : 'no fit was tried or reached it';
  return `${what} written by a decomposition, in more gates than a fit takes: ${why}`;
}

function closedAfterAll(road: Road, why: string): Road & { kind: 'undecided' } {
  return { kind: 'undecided', reason: `${road.reason}, ${why}`, bracket: null };
}

function answer(job: Job, road: Road, done: Rewritten | null): Narrowed {
  const { original, contract, options, seed } = job;
  const check = done?.check;
  const isGood = check !== undefined && check.verdict === 'same';
  const verdict = done ? (isGood ? 'narrowed' : 'undecided') : closedVerdict(road);
  const circuit = done?.narrowed.circuit ?? null;
  const report: NarrowReport = {
    schema: 'wiregauge/narrow@1',
    seed,
    contract: contractName(contract),
    contractFromFile: contract.decidedBy === 'file',
    seconds: 0,
    notes: [...job.notes, ...(done?.narrowed.rules ?? []), ...(check?.notes ?? [])],
    circuit: original.name,
    verdict,
    reason: done && !isGood ? `${road.reason}; the check found ${checkText(check)}` : road.reason,
    before: countCircuit(original),
    after: circuit ? countCircuit(circuit) : null,
    reuse: done?.narrowed.reuse ?? [],
    distance: check?.distance ?? null,
    bracket: 'bracket' in road ? road.bracket : null,
    check: check
      ? {
          method: check.method,
          proof: check.proof,
          unfoldedWires: check.unfoldedWires,
          distance: check.distance?.hilbertSchmidt ?? Number.NaN,
        }
      : null,
    native: job.native.text,
    estimate: estimateOf(original, circuit, options.device, job.notes),
    fits: done?.fits ?? [],
    windows: done?.windows ?? [],
    files: [],
  };
  return { report, text: done?.text ?? null, circuit };
}

function closedVerdict(road: Road): 'impossible' | 'undecided' {
  return road.kind === 'impossible' ? 'impossible' : 'undecided';
}

function checkText(check: CompareReport | undefined): string {
  if (!check?.distance) return 'no way to compare them';
  return `a distance of D = ${figures(check.distance.hilbertSchmidt)}`;
}

function estimateOf(
  before: Circuit,
  after: Circuit | null,
  device: Device | undefined,
  notes: string[],
): NarrowReport['estimate'] {
  if (!device || !after) return null;
  if (before.wires > device.wires.length) {
    notes.push(`${device.name} has fewer wires than the original: no estimate for it`);
    return null;
  }
  const [first, second] = [estimateSuccess(before, device), estimateSuccess(after, device)];
  return { before: first.success, after: second.success };
}
