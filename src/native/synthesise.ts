/**
 * Makes a block from few entanglers: chooses between exact roads, a search, and a decomposition that is made shorter.
 *
 * One wire needs none, two wires have a closed form (`two-wire.ts`). Factors on separate wires are built on their own; on
 * four wires and more so are diagonals, permutations and wires that select (`structured.ts`), and what comes out is fitted
 * with fewer entanglers on four wires, window by window on more. Everything else is searched for (`search.ts`) on up to
 * `SEARCH_WIRES_MAX` wires. On five wires and more, and where a search ends without success, the quantum Shannon decomposition
 * (`shannon.ts`) is sure; its windows are fitted anew until none improves (`windows.ts`).
 * Links that are missing are gone round by ladders of CX (`links.ts`).
 * A stop from outside keeps the best so far, which is exact as soon as a decomposition is there.
 */
import { type GateOperation, unitaryGate } from '../circuit/circuit.ts';
import { gateMatrix } from '../circuit/unitary.ts';
import type { Pair } from '../reshape/placement-beam.ts';
import { decompose } from './decompose.ts';
import { goRound, isConnected, linksWithin } from './links.ts';
import { exact, Search, type Synthesis, type SynthesisOptions } from './search.ts';
import { shannonGates } from './shannon.ts';
import { factorsOf } from './structure.ts';
import { type BuildPart, type Structured, structuredGates } from './structured.ts';
import {
  anglesEach,
  type EntanglerUse,
  entanglerUse,
  twoWireGates,
  usesNeeded,
} from './two-wire.ts';
import { dimensionBound, isWhole, type Wanted } from './wanted.ts';
import { inEntanglers, refitWindows } from './windows.ts';

/** Generic targets on more wires are not searched for: a fit takes hours. */
export const SEARCH_WIRES_MAX = 5;
/** Structure other than factors is taken apart from this many wires on; below, a search is better. */
const STRUCTURED_WIRES_MIN = 4;

export async function synthesise(wanted: Wanted, options: SynthesisOptions): Promise<Synthesis> {
  const use = entanglerUse(options.entangler);
  const { wires, matrix } = wanted;
  if (wires === 1) return exact([unitaryGate(matrix, [0])], 0);
  const most = options.entanglersMax ?? Number.POSITIVE_INFINITY;
  if (wires === 2 && isWhole(wanted)) {
    const uses = usesNeeded(matrix, use);
    const gates = twoWireGates(matrix, use);
    if (gates && uses !== undefined && uses <= most) return exactPair(gates, uses, use);
  }
  const known = await exactRoad(wanted, options, use);
  if (known && usesIn(known.operations) <= most) return known;
  if (wires > SEARCH_WIRES_MAX) {
    const found = await decomposed(wanted, options, use);
    return { ...found, isStopped: found.isStopped || usesIn(found.operations) > most };
  }
  const searched = await new Search(wanted, options).run();
  const isDone = (searched.fits[0]?.distance ?? 1) <= options.tolerance;
  if (isDone || wires < 3) return searched;
  const sure = await decomposed(wanted, options, use);
  if (usesIn(sure.operations) > most) return searched;
  return { ...sure, frontier: searched.frontier };
}

function usesIn(operations: readonly GateOperation[]): number {
  return operations.filter(({ wires }) => wires.length === 2).length;
}

function exactPair(operations: GateOperation[], uses: number, use: EntanglerUse): Synthesis {
  // counts of fitted classes beyond two uses are the fewest that were found
  const isTheorem = use.kind !== 'other' || uses <= 2;
  return isTheorem ? exact(operations, uses) : { ...exact(operations, 0), boundKind: 'found' };
}

/** By structure; undefined where there is none, or where a search does better. */
async function exactRoad(
  wanted: Wanted,
  options: SynthesisOptions,
  use: EntanglerUse,
): Promise<Synthesis | undefined> {
  const { wires, matrix } = wanted;
  if (wires < 3 || !isWhole(wanted)) return undefined;
  if (wires < STRUCTURED_WIRES_MIN && factorsOf(matrix, wires).length === 1) return undefined;
  const build: BuildPart = async (part, of) => {
    const columns = Array.from({ length: 2 ** of.length }, (_, k) => k);
    const { hint: _, entanglersMax: __, ...rest } = { ...options, isPart: true };
    const inner = { wires: of.length, matrix: part, columns };
    return (await synthesise(inner, { ...rest, links: linksAmong(options.links, of) })).operations;
  };
  const found = await structuredGates(matrix, wires, build);
  const written = found && inEntanglers(linked(found.operations, options, wires), use, gateMatrix);
  if (!written) return undefined;
  return improved(wanted, { ...found, operations: written }, options, use);
}

/** The links between these wires, renumbered; all pairs when they are not connected (`goRound` sees to it). */
function linksAmong(links: readonly Pair[], of: readonly number[]): Pair[] {
  const inner = linksWithin(links, of);
  if (isConnected(inner, of.length)) return inner;
  return of.flatMap((_, a) => of.slice(a + 1).map((__, b): Pair => [a, a + 1 + b]));
}

function linked(
  operations: readonly GateOperation[],
  { links }: SynthesisOptions,
  wires: number,
): GateOperation[] {
  return goRound(
    operations.flatMap((operation) => decompose(operation)),
    links,
    wires,
  );
}

/** What was taken apart, made shorter: on four wires as a whole, on more by windows. */
async function improved(
  wanted: Wanted,
  { operations, note, isFinal }: Structured,
  options: SynthesisOptions,
  use: EntanglerUse,
): Promise<Synthesis> {
  const before = usesIn(operations);
  const plain: Synthesis = { ...exact(operations, 0), boundKind: 'found', notes: [note] };
  if (before === 0) return { ...plain, boundKind: 'proven' };
  const isComplete = options.links.length === (wanted.wires * (wanted.wires - 1)) / 2;
  if (isFinal && isComplete) return plain;
  if (wanted.wires === 4 && use.kind !== 'adjustable') {
    const pairs = operations.flatMap(({ wires: [a, b] }): Pair[] => (b === undefined ? [] : [[a!, b]])); // biome-ignore format: one list
    const { hint: _, ...rest } = options;
    const found = await new Search(wanted, {
      ...rest,
      hint: pairs,
      hintGates: operations,
    }).runFromHint();
    const isBetter = usesIn(found.operations) < before;
    const isRight = (found.fits[0]?.distance ?? 1) <= options.tolerance;
    if (isBetter && isRight) return { ...found, notes: [note, ...found.notes] };
    return { ...plain, frontier: found.frontier, isStopped: found.isStopped };
  }
  if (wanted.wires > 4) return byWindows(operations, wanted, options, use, note);
  return plain;
}

/** The quantum Shannon decomposition, and windows of it fitted anew. */
async function decomposed(
  wanted: Wanted,
  options: SynthesisOptions,
  use: EntanglerUse,
): Promise<Synthesis> {
  options.control.report({ stage: `decomposing ${wanted.wires} wires` });
  const gates = linked(shannonGates(wanted.matrix, wanted.wires), options, wanted.wires);
  const operations = inEntanglers(gates, use, gateMatrix);
  if (!operations) return { ...exact([], 0), boundKind: 'found', notes: ['the entangler does not entangle'], isStopped: true }; // biome-ignore format: one case
  return byWindows(operations, wanted, options, use, 'quantum Shannon decomposition');
}

async function byWindows(
  operations: GateOperation[],
  wanted: Wanted,
  options: SynthesisOptions,
  use: EntanglerUse,
  what: string,
): Promise<Synthesis> {
  const { links, seed, optimiser, runJobs, control } = options;
  const each = anglesEach(options.entangler);
  const refitted = await refitWindows(operations, wanted.wires, {
    use,
    links,
    enoughFor: (k) => (k === 2 ? 3 : dimensionBound(k, 2 ** k, each)),
    seed,
    optimiser,
    runJobs,
    control,
  });
  const [before, after] = [usesIn(operations), usesIn(refitted.operations)];
  const notes = [`${what}: ${before} entanglers`];
  if (after < before) {
    notes.push(`${refitted.improved} windows fitted anew: ${after} entanglers`);
  }
  if (refitted.isStopped) notes.push('stopped before every window was tried: more time may save entanglers'); // biome-ignore format: one sentence
  return {
    ...exact(refitted.operations, 0),
    boundKind: 'found',
    notes,
    isStopped: refitted.isStopped,
  };
}
