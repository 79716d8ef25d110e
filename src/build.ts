/**
 * Makes native gates for a block: a unitary, or, where inputs start in |0>, only the columns that count.
 *
 * One wire: Euler angles. Two wires: the canonical decomposition, with the fewest uses of the entangler where its class is
 * known (`native/two-wire.ts`), else a fit at rising counts. Three wires and more: fits at rising counts from the bound by
 * dimension for generic targets, or from few entanglers for special ones (`native/synthesise.ts`).
 * The distance in the report is computed anew from the gates that are returned.
 */

import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  type Operation,
} from './circuit/circuit.ts';
import { contractOf } from './circuit/contract.ts';
import { countCircuit } from './circuit/counts.ts';
import { applyGateInto, circuitUnitary } from './circuit/unitary.ts';
import { type ContractOptions, contractName } from './contract.ts';
import { type Control, freeRunning } from './control.ts';
import { InputError } from './input-error.ts';
import type { RunJobs } from './jobs.ts';
import { canonical, makhlinInvariants } from './native/canonical.ts';
import { isConnected } from './native/links.ts';
import { type CustomEntangler, type NativeSet, nativeSetOf } from './native/native-set.ts';
import { synthesise } from './native/synthesise.ts';
import { toNative } from './native/to-native.ts';
import { isWhole, type Wanted, wantedDistance } from './native/wanted.ts';
import { distanceAngle, processInfidelity } from './numeric/distance.ts';
import type { BuildReport } from './reports.ts';

export type BuildOptions = ContractOptions & {
  native?: string;
  custom?: readonly CustomEntangler[];
  /** Pairs of wires that may interact; all of them unless given. */
  links?: readonly (readonly [number, number])[];
  /** At most this many entanglers; the best fit. */
  entanglers?: number;
  optimiser?: 'lm' | 'bfgs' | 'nelder-mead';
  tolerance?: number;
  seed?: number;
  runJobs: RunJobs;
  control?: Control;
};

export const BUILD_WIRES_MAX = 8;
/** Circuits on more wires keep their own gates. */
const CIRCUIT_WIRES_MAX = 5;
const CLASS_ROUNDING = 1e-14;

export async function buildTarget(
  target: Circuit,
  options: BuildOptions,
): Promise<{ report: BuildReport; circuit: Circuit }> {
  const { native = 'cx,rz,sx', tolerance = 1e-10, seed = 1, control = freeRunning } = options;
  const set = nativeSetOf(native, options.custom);
  const contract = contractOf(target, options);
  const links = checkedLinks(options.links, target.wires);
  if (target.wires > CIRCUIT_WIRES_MAX && hasGates(target)) {
    return converted(target, options, set, contractName(contract), contract.decidedBy === 'file');
  }
  const wanted = wantedOf(target, contract.inputs);
  const hint = hintOf(target, links, set);
  const found = await synthesise(wanted, {
    ...(hint ? { hint } : {}),
    entangler: set.entangler,
    links,
    ...(options.entanglers === undefined ? {} : { entanglersMax: options.entanglers }),
    tolerance,
    seed,
    optimiser: options.optimiser ?? 'lm',
    runJobs: options.runJobs,
    control,
  });
  const synthesised = toNative(found.operations, target.wires, set);
  const fewest = withoutMore(synthesised, target, links, set, options);
  const operations = fewest ?? synthesised;
  if (fewest) {
    found.notes.push(
      'the gates as written, joined and converted, need fewer entanglers than any fit found',
    );
    found.bound = 0;
    found.boundKind = 'found';
    found.fits = [];
  }
  const circuit: Circuit = { ...emptyCircuit(target.wires, 0, target.name), operations };
  const made = columnsOf(operations as readonly GateOperation[], wanted);
  const hilbertSchmidt = wantedDistance(wanted, made);
  const isWithin =
    countCircuit(circuit).twoQubit <= (options.entanglers ?? Number.POSITIVE_INFINITY);
  const isBuilt = hilbertSchmidt <= tolerance && isWithin;
  return {
    circuit,
    report: {
      schema: 'wiregauge/build@1',
      seed,
      contract: contractName(contract),
      contractFromFile: contract.decidedBy === 'file',
      seconds: 0,
      notes: [...found.notes],
      target: target.name,
      verdict: isBuilt ? 'built' : found.isStopped ? 'undecided' : 'approximate',
      counts: countCircuit(circuit),
      distance: {
        hilbertSchmidt,
        processInfidelity: processInfidelity(hilbertSchmidt),
        worstCase: null,
        angle: distanceAngle(hilbertSchmidt),
      },
      entanglers: {
        used: countCircuit(circuit).twoQubit,
        bound: found.bound,
        boundKind: found.boundKind,
      },
      canonical: classOf(wanted),
      frontier: found.frontier,
      fits: found.fits,
      native: set.text,
      files: [],
    },
  };
}

/** The class of a whole two-wire target; numbers that are rounding of zero are zero. */
function classOf(wanted: Wanted): BuildReport['canonical'] {
  if (wanted.wires !== 2 || !isWhole(wanted)) return null;
  const plain = (x: number): number => (Math.abs(x) < CLASS_ROUNDING ? 0 : x);
  const [c1, c2, c3] = canonical(wanted.matrix).c.map((c) => plain(c / (Math.PI / 4)));
  const { g1, g2 } = makhlinInvariants(wanted.matrix);
  return {
    coordinates: [c1!, c2!, c3!],
    makhlin: [plain(g1[0]), plain(g1[1]), plain(g2)],
  };
}

/** True for a circuit with gates of its own: not a bare unitary. */
function hasGates(target: Circuit): boolean {
  return target.operations.every(
    (operation) =>
      operation.kind === 'barrier' ||
      (operation.kind === 'gate' && !operation.condition && operation.name !== 'unitary'),
  );
}

/** Where the circuit as written has its entanglers, when it may have them there. */
function hintOf(
  target: Circuit,
  links: readonly (readonly [number, number])[],
  set: NativeSet,
): (readonly [number, number])[] | null {
  if (!hasGates(target)) return null;
  const pairs = toNative(target.operations, target.wires, set).flatMap(
    (operation): (readonly [number, number])[] =>
      operation.kind === 'gate' && operation.wires.length === 2
        ? [[operation.wires[0]!, operation.wires[1]!]]
        : [],
  );
  const isLinked = pairs.every(([a, b]) =>
    links.some(([p, q]) => (p === a && q === b) || (p === b && q === a)),
  );
  return isLinked ? pairs : null;
}

/** The circuit's own gates in the native set, when they need fewer entanglers than what was found; else null. */
function withoutMore(
  found: readonly Operation[],
  target: Circuit,
  links: readonly (readonly [number, number])[],
  set: NativeSet,
  { entanglers = Number.POSITIVE_INFINITY }: BuildOptions,
): Operation[] | null {
  const isComplete = links.length === (target.wires * (target.wires - 1)) / 2;
  if (!hasGates(target) || !isComplete) return null;
  const own = toNative(target.operations, target.wires, set);
  const count = (list: readonly Operation[]): number =>
    list.filter((operation) => operation.kind === 'gate' && operation.wires.length > 1).length;
  return count(own) < count(found) && count(own) <= entanglers ? own : null;
}

/** Circuits too large for a synthesis of the whole: gates on one pair joined, and converted exactly. */
function converted(
  target: Circuit,
  { seed = 1 }: BuildOptions,
  set: NativeSet,
  contract: string,
  contractFromFile: boolean,
): { report: BuildReport; circuit: Circuit } {
  const operations = toNative(target.operations, target.wires, set);
  const circuit: Circuit = { ...emptyCircuit(target.wires, 0, target.name), operations };
  const counts = countCircuit(circuit);
  return {
    circuit,
    report: {
      schema: 'wiregauge/build@1',
      seed,
      contract,
      contractFromFile,
      seconds: 0,
      notes: [
        `more than ${CIRCUIT_WIRES_MAX} wires: converted gate by gate, exactly; the distance is that of the rules, not measured`,
      ],
      target: target.name,
      verdict: 'built',
      counts,
      distance: { hilbertSchmidt: 0, processInfidelity: 0, worstCase: null, angle: 0 },
      entanglers: { used: counts.twoQubit, bound: 0, boundKind: 'found' },
      canonical: null,
      frontier: [],
      fits: [],
      native: set.text,
      files: [],
    },
  };
}

function wantedOf(target: Circuit, inputs: readonly ('any' | 'zero')[]): Wanted {
  if (target.wires > BUILD_WIRES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `number of wires must be at most ${BUILD_WIRES_MAX} for build, got ${target.wires}`,
      file: target.name,
    });
  }
  const n = target.wires;
  const d = 2 ** n;
  const matrix = circuitUnitary(target);
  const zeroMask = inputs.reduce(
    (mask, rule, k) => mask + (rule === 'zero' ? 2 ** (n - 1 - k) : 0),
    0,
  );
  const columns: number[] = [];
  for (let k = 0; k < d; k++) if ((k & zeroMask) === 0) columns.push(k);
  return { wires: n, matrix, columns };
}

function columnsOf(operations: readonly GateOperation[], { wires, columns }: Wanted): Float64Array {
  const d = 2 ** wires;
  const c = columns.length;
  const out = new Float64Array(2 * d * c);
  columns.forEach((column, k) => {
    out[column * c + k] = 1;
  });
  for (const operation of operations) applyGateInto(out, operation, wires, c);
  return out;
}

function checkedLinks(
  links: BuildOptions['links'],
  wires: number,
): readonly (readonly [number, number])[] {
  // circuits beyond the fits are only converted; a list of all pairs of 10,000 wires would fill the memory
  if (!links && wires > BUILD_WIRES_MAX) return [];
  const all: [number, number][] = [];
  if (!links) for (let a = 0; a < wires; a++) for (let b = a + 1; b < wires; b++) all.push([a, b]);
  const given = links?.filter(([a, b]) => a < wires && b < wires) ?? all;
  if (!isConnected(given, wires)) {
    throw new InputError({
      code: 'not-connected',
      message: `expected links that connect all ${wires} wires, got ${
        given
          .slice(0, 50)
          .map((pair) => pair.join('-'))
          .join() || 'none'
      }`,
    });
  }
  return given;
}
