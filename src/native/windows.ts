/**
 * Makes a circuit shorter by fitting windows of it anew, until none improves.
 *
 * Shape: gates on one and two wires in order of time, those on two wires being uses of the entangler; the result is the
 * same unitary up to a phase and rounding, in the same gates.
 * Method: a window is a convex piece of the circuit on two to four wires: it grows along the gates, an operation that
 * reaches outside blocks its wires, and what does not depend on the window moves in front of it. Windows of a
 * pass do not overlap; those with more entanglers than any unitary of their size needs (counting dimensions: Shende,
 * Markov, Bullock, PRA 69, 062321 (2004)) are fitted at that number, and short ones with one entangler taken out. Passes
 * take the windows as they come and then every set of wires in turn.
 * A fit counts when its D is at most `DISTANCE_MAX`; the errors of all windows add up as angles.
 * Batches are decided in list order, so the answer does not depend on the number of workers; a stop from outside keeps what
 * was reached.
 */

import { type GateOperation, onWires, unitaryGate } from '../circuit/circuit.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import type { Control } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import { identity } from '../numeric/complex-matrix.ts';
import type { FitJob, FitResult } from '../reshape/fit-block.ts';
import type { Pair } from '../reshape/placement-beam.ts';
import { entanglerTemplate, type Template, templateOperations } from '../reshape/template.ts';
import { isConnected, linksWithin } from './links.ts';
import { type EntanglerUse, twoWireGates, usesNeeded } from './two-wire.ts';

const DISTANCE_MAX = 1e-22;
const GOAL = 1e-26;
const ITERATIONS_MAX = 400;
/** Starts for a window before it is given up in this pass. */
const STARTS = 3;
/** A window looks at most this many operations ahead. */
const REACH = 20_000;
/** On more wires only the last ones and those that come by themselves are windows: cutting takes long. */
const ALL_SETS_WIRES_MAX = 6;
/** Windows at or below the bound lose one entangler by trial only in circuits with at most this many entanglers. */
const TRIAL_ENTANGLERS_MAX = 60;

export type WindowSettings = {
  use: EntanglerUse;
  links: readonly Pair[];
  /** Entanglers that any unitary on this many wires can be fitted with. */
  enoughFor(wires: number): number;
  seed: number;
  optimiser: FitJob['optimiser'];
  runJobs: RunJobs;
  control: Control;
};

export type Refitted = {
  operations: GateOperation[];
  /** Windows that became shorter. */
  improved: number;
  isStopped: boolean;
};

type Window = { wires: number[]; members: GateOperation[] };
type Item = { wires: readonly number[]; operation?: GateOperation; window?: Window };

export async function refitWindows(
  given: readonly GateOperation[],
  wires: number,
  settings: WindowSettings,
): Promise<Refitted> {
  const { control } = settings;
  let operations = [...given];
  let improved = 0;
  for (const size of [4, 3, 2]) {
    if (size >= wires) continue;
    const sets = setsFor(wires, size);
    // a pass over every set without success ends it
    for (let at = 0, idle = 0; idle < sets.length; at = (at + 1) % sets.length) {
      if (control.stopped()) return { operations, improved, isStopped: true };
      const items = cutWindows(operations, size, sets[at]!);
      const windows = items.flatMap(({ window }) => (window ? [window] : []));
      const label = `${size}/${at}/${improved}`;
      // by trial only once a round: a failure costs as many fits as there are entanglers
      const isTrial = size === 3 && sets[at] === null;
      const total = entanglersIn(operations);
      const count = await refitAll(windows, size, total, settings, label, isTrial);
      improved += count;
      idle = count > 0 ? 0 : idle + 1;
      operations = items.flatMap(({ operation, window }) =>
        window ? window.members : operation ? [operation] : [],
      );
    }
  }
  return { operations, improved, isStopped: control.stopped() };
}

function entanglersIn(operations: readonly GateOperation[]): number {
  return operations.filter(({ wires }) => wires.length === 2).length;
}

/** Which wires windows may have, pass by pass; null = as they come. The last wires carry the blocks of a recursion. */
function setsFor(wires: number, size: number): (number[] | null)[] {
  const all = subsetsOf(wires, size).reverse();
  const [last] = all;
  return wires > ALL_SETS_WIRES_MAX ? [last!, null] : [last!, null, ...all.slice(1)];
}

function subsetsOf(wires: number, size: number): number[][] {
  const out: number[][] = [];
  const grow = (from: number, chosen: readonly number[]): void => {
    if (chosen.length === size) out.push([...chosen]);
    else for (let k = from; k < wires; k++) grow(k + 1, [...chosen, k]);
  };
  grow(0, []);
  return out;
}

/** The circuit as windows and what is left between them; with `only`, windows on these wires. */
export function cutWindows(
  operations: readonly GateOperation[],
  size: number,
  only: readonly number[] | null,
): Item[] {
  const done: Item[] = [];
  let rest: Item[] = operations.map((operation) => ({ wires: operation.wires, operation }));
  let at = 0;
  while (at < rest.length) {
    const item = rest[at]!;
    const isStart = item.wires.length === 2 && (!only || item.wires.every((w) => only.includes(w)));
    if (!isStart) {
      done.push(item);
      at++;
      continue;
    }
    const { window, before, after } = grown(rest, at, size, only);
    done.push(...before, { wires: window.wires, window });
    // what comes after the window is looked at again, as a start of others
    rest = [...after.items, ...rest.slice(after.end)];
    at = 0;
  }
  return done;
}

function grown(
  list: readonly Item[],
  start: number,
  size: number,
  only: readonly number[] | null,
): { window: Window; before: Item[]; after: { items: Item[]; end: number } } {
  const inside = new Set(only ?? list[start]!.wires);
  const blocked = new Set<number>();
  const window: Window = { wires: [], members: [] };
  const before: Item[] = [];
  const items: Item[] = [];
  let end = start;
  for (; end < list.length && end < start + REACH; end++) {
    const open = [...inside].filter((wire) => !blocked.has(wire)).length;
    if (open < 2 && inside.size === size) break;
    if (open === 0) break;
    const item = list[end]!;
    const { wires } = item;
    const isBlocked = wires.some((wire) => blocked.has(wire));
    const isTouching = wires.some((wire) => inside.has(wire));
    const isWithin = wires.every((wire) => inside.has(wire));
    const canJoin = isTouching && !only && new Set([...inside, ...wires]).size <= size;
    if (!isBlocked && (isWithin || canJoin)) {
      for (const wire of wires) inside.add(wire);
      window.members.push(item.operation!); // only plain operations are in the list
    } else if (!isBlocked && !isTouching) before.push(item);
    else {
      for (const wire of wires) blocked.add(wire);
      items.push(item);
    }
  }
  window.wires = [...inside].sort((a, b) => a - b);
  return { window, before, after: { items, end } };
}

/** Fits the windows that can become shorter, in place; how many did. */
async function refitAll(
  windows: readonly Window[],
  size: number,
  total: number,
  settings: WindowSettings,
  label: string,
  isTrial: boolean,
): Promise<number> {
  const { use, enoughFor, control } = settings;
  let improved = 0;
  const long: Window[] = [];
  const short: Window[] = [];
  for (const window of windows) {
    const count = entanglersIn(window.members);
    if (window.wires.length === 2) {
      if (rewritePair(window, use)) improved++;
    } else if (count > enoughFor(window.wires.length)) long.push(window);
    else if (count > 2 && isTrial && total <= TRIAL_ENTANGLERS_MAX) short.push(window);
  }
  const candidates = long;
  for (let round = 0; round < STARTS && candidates.length > 0; round++) {
    control.report({ stage: `refitting ${candidates.length} windows of ${size} wires; ${total} entanglers` }); // biome-ignore format: one sentence
    const jobs = candidates.map((window) => {
      const pairs = cyclicPairs(window, enoughFor(window.wires.length), round, settings);
      return pairs && { window, pairs };
    });
    const placed = jobs.flatMap((job) => (job ? [job] : []));
    const done = await fitPlaced(placed, settings, `${label}/${round}`);
    improved += done.size;
    for (const window of done) candidates.splice(candidates.indexOf(window), 1);
    if (placed.length === 0 || control.stopped()) break;
  }
  if (short.length > 0 && !control.stopped()) improved += await trial(short, settings, label);
  return improved;
}

/** One entangler less, each in turn, from a random start. */
async function trial(
  windows: readonly Window[],
  settings: WindowSettings,
  label: string,
): Promise<number> {
  const placed = windows.flatMap((window) => {
    const pairs = window.members.flatMap(({ wires: [a, b] }): Pair[] =>
      b === undefined ? [] : [[window.wires.indexOf(a!), window.wires.indexOf(b)]],
    );
    return pairs.map((_, k) => ({ window, pairs: [...pairs.slice(0, k), ...pairs.slice(k + 1)] }));
  });
  return (await fitPlaced(placed, settings, `${label}/trial`)).size;
}

function rewritePair(window: Window, use: EntanglerUse): boolean {
  const matrix = matrixOf(window);
  const uses = usesNeeded(matrix, use);
  if (uses === undefined || uses >= entanglersIn(window.members)) return false;
  const gates = twoWireGates(matrix, use);
  if (!gates) return false;
  window.members = onWires(gates, window.wires);
  return true;
}

/** Pairs in cyclic order over the links inside the window; undefined when they do not connect it. */
function cyclicPairs(
  { wires }: Window,
  count: number,
  shift: number,
  { links }: WindowSettings,
): Pair[] | undefined {
  const inner = linksWithin(links, wires);
  if (!isConnected(inner, wires.length)) return undefined;
  return Array.from({ length: count }, (_, k) => inner[(k + shift) % inner.length]!);
}

/** Fits each placement; windows whose fit reaches their matrix take it over. */
async function fitPlaced(
  placed: readonly { window: Window; pairs: readonly Pair[] }[],
  { use, seed, optimiser, runJobs, control }: WindowSettings,
  label: string,
): Promise<Set<Window>> {
  const matrices = new Map<Window, Float64Array>();
  for (const { window } of placed) {
    if (!matrices.has(window)) matrices.set(window, matrixOf(window));
  }
  const templates: Template[] = placed.map(({ window, pairs }) =>
    entanglerTemplate(window.wires.length, pairs, use.entangler),
  );
  const jobs = placed.map(
    ({ window }, k): FitJob => ({
      kind: 'fit',
      id: `windows/${label}/${k}`,
      seed,
      template: templates[k]!,
      target: { kind: 'unitary', matrix: matrices.get(window)! },
      optimiser,
      goal: GOAL,
      iterationsMax: ITERATIONS_MAX,
    }),
  );
  const results = await runJobs<FitJob, FitResult>(jobs, { control });
  const done = new Set<Window>();
  results.forEach((result, k) => {
    const { window } = placed[k]!;
    if (!result || done.has(window) || !(result.distance <= DISTANCE_MAX)) return;
    done.add(window);
    window.members = onWires(templateOperations(templates[k]!, result.angles), window.wires);
  });
  return done;
}

function matrixOf({ wires, members }: Window): Float64Array {
  const d = 2 ** wires.length;
  const out = identity(d);
  for (const operation of members) {
    const own = { ...operation, wires: operation.wires.map((wire) => wires.indexOf(wire)) };
    applyGateInto(out, own, wires.length, d);
  }
  return out;
}

/** Every gate on two wires in uses of the entangler; undefined when its class has no closed form. */
export function inEntanglers(
  operations: readonly GateOperation[],
  use: EntanglerUse,
  matrixFor: (operation: GateOperation) => Float64Array,
): GateOperation[] | undefined {
  const out: GateOperation[] = [];
  for (const operation of operations) {
    if (operation.wires.length < 2) {
      out.push(unitaryGate(matrixFor(operation), operation.wires));
      continue;
    }
    const gates = twoWireGates(matrixFor(operation), use);
    if (!gates) return undefined;
    out.push(...onWires(gates, operation.wires));
  }
  return out;
}
