/**
 * Finds few entanglers for a block by fitting templates at rising counts.
 *
 * What is wanted: the columns of a unitary that count, all of them for a block, one for a state.
 * Method: two wires with an entangler of known class are exact. Otherwise counts rise from the least that can do; for each,
 * templates with different placements of the pairs are fitted, cheap for special targets: a beam keeps the placements
 * that came nearest, and the next count extends each of them by one more pair on every link, started from its angles.
 * When the beam ends, or at once where nothing special shows, cyclic and random placements at the bound by dimension are
 * fitted from random starts (Shende, Markov, Bullock, PRA 69, 062321 (2004); for isometries Iten et al., PRA 93, 032318
 * (2016): the free real numbers of the target less 3 per wire, over 4).
 * How the count is known: `proven` when it meets a theorem's bound, `exhausted below` when every placement of fewer was
 * tried, else `found`.
 * Every batch is decided in list order, so the answer does not depend on the number of workers.
 */
import { type GateOperation, unitaryGate } from '../circuit/circuit.ts';
import type { Control } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { random } from '../numeric/random.ts';
import type { FitRow } from '../reports.ts';
import type { FitJob, FitResult, FitTarget } from '../reshape/fit-block.ts';
import {
  angleCount,
  type Entangler,
  entanglerTemplate,
  type Template,
  templateOperations,
} from '../reshape/template.ts';
import { entanglerUse, twoWireGates, usesNeeded } from './two-wire.ts';

export type Pair = readonly [number, number];

/** A block: its whole unitary (planar), and which input basis states count. */
export type Wanted = { wires: number; matrix: Float64Array; columns: readonly number[] };

export type SynthesisOptions = {
  entangler: Entangler;
  links: readonly Pair[];
  entanglersMax?: number;
  tolerance: number;
  seed: number;
  optimiser: FitJob['optimiser'];
  runJobs: RunJobs;
  control: Control;
};

export type Synthesis = {
  operations: GateOperation[];
  bound: number;
  boundKind: 'proven' | 'exhausted below' | 'found';
  frontier: { entanglers: number; distance: number }[];
  fits: FitRow[];
  notes: string[];
  isStopped: boolean;
};

/** Special targets are searched for up to this many entanglers before the generic count is taken. */
const SEARCH_MAX = 11;
const BEAM = 12;
const ITERATIONS_MAX = 400;
const GENERIC_STARTS = 12;
/** D of a fit that counts as exact: far below any tolerance, above rounding. */
const GOAL = 1e-24;

/** D between the wanted columns and those made (2^n x columns, planar). */
export function wantedDistance(wanted: Wanted, made: Float64Array): number {
  const target = wantedColumns(wanted);
  // the formula of distance.ts is per column: it divides by the root of the number of entries
  const { distance } = hilbertSchmidtDistance(target, made);
  const d = 2 ** wanted.wires;
  return (distance * Math.sqrt(d * wanted.columns.length)) / wanted.columns.length;
}

function wantedColumns({ wires, matrix, columns }: Wanted): Float64Array {
  const d = 2 ** wires;
  const c = columns.length;
  const out = new Float64Array(2 * d * c);
  for (let r = 0; r < d; r++) {
    columns.forEach((column, k) => {
      out[r * c + k] = matrix[r * d + column]!;
      out[d * c + r * c + k] = matrix[d * d + r * d + column]!;
    });
  }
  return out;
}

/** Least number of CX by counting real numbers; other fixed entanglers bring up to six each. */
export function dimensionBound(wires: number, columns: number, isCxLike: boolean): number {
  const d = 2 ** wires;
  const m = Math.log2(columns);
  if (columns === d)
    return Math.max(0, Math.ceil((4 ** wires - 3 * wires - 1) / (isCxLike ? 4 : 6)));
  const free = 2 ** (wires + m + 1) - 4 ** m - 2 * wires - m - 1;
  return Math.max(0, Math.ceil(free / (isCxLike ? 4 : 6)));
}

export async function synthesise(wanted: Wanted, options: SynthesisOptions): Promise<Synthesis> {
  const use = entanglerUse(options.entangler);
  const d = 2 ** wanted.wires;
  const isWhole = wanted.columns.length === d;
  const isFree = options.entanglersMax === undefined;
  if (wanted.wires === 1) return exact([unitaryGate(wanted.matrix, [0])], 0);
  if (wanted.wires === 2 && isWhole) {
    const uses = usesNeeded(wanted.matrix, use);
    const gates = twoWireGates(wanted.matrix, use);
    if (gates && uses !== undefined && (isFree || uses <= options.entanglersMax!)) {
      return exact(gates, uses);
    }
  }
  return new Search(wanted, options, use.kind !== 'other').run();
}

function exact(operations: GateOperation[], bound: number): Synthesis {
  const fits: FitRow[] = [];
  return {
    operations,
    bound,
    boundKind: 'proven',
    frontier: [],
    fits,
    notes: [],
    isStopped: false,
  };
}

type Candidate = { pairs: Pair[]; angles: Float64Array; distance: number; iterations: number; status: string }; // biome-ignore format: one line

/** One search: its candidates, and the best per count for the frontier. */
class Search {
  private readonly frontier = new Map<number, Candidate>();
  private readonly target: FitTarget;
  private readonly order: number[];
  private readonly wanted: Wanted;
  private readonly options: SynthesisOptions;
  private readonly generic: number;
  private readonly isCxLike: boolean;
  private isExhausted = true;

  constructor(wanted: Wanted, options: SynthesisOptions, isCxLike: boolean) {
    this.wanted = wanted;
    this.options = options;
    this.isCxLike = isCxLike;
    const d = 2 ** wanted.wires;
    this.generic = dimensionBound(wanted.wires, wanted.columns.length, isCxLike);
    // a fit counts the first columns: wires that start in |0> come first
    this.order = wireOrder(wanted);
    this.target =
      wanted.columns.length === d
        ? { kind: 'unitary', matrix: wanted.matrix }
        : {
            kind: 'columns',
            matrix: reordered(wanted, this.order),
            columns: wanted.columns.length,
          };
  }

  async run(): Promise<Synthesis> {
    const { entanglersMax = Number.POSITIVE_INFINITY } = this.options;
    const isSmall = this.generic <= 5;
    const isSpecial = isSmall || (await this.looksSpecial());
    if (isSpecial) {
      const found = await this.beam(
        Math.min(entanglersMax, isSmall ? this.generic + 4 : SEARCH_MAX),
      );
      if (found) return this.answer(found);
    } else this.isExhausted = false;
    if (entanglersMax < this.generic) {
      await this.placements(entanglersMax, GENERIC_STARTS);
      return this.answer(null);
    }
    for (let spare = 0; spare <= 4 && this.generic + spare <= entanglersMax; spare++) {
      if (this.options.control.stopped()) break;
      const found = await this.placements(this.generic + spare, GENERIC_STARTS);
      if (found) return this.answer(found);
    }
    return this.answer(null);
  }

  /** Few distinct sizes among the entries: gates and Fourier transforms have it, generic unitaries do not. */
  private async looksSpecial(): Promise<boolean> {
    const { matrix } = this.wanted;
    const half = matrix.length / 2;
    const sizes = new Set<number>();
    for (let k = 0; k < half; k++) {
      sizes.add(Math.round(1e7 * Math.hypot(matrix[k]!, matrix[half + k]!)));
    }
    return sizes.size <= half / 4;
  }

  /** Rising counts, each extending the nearest placements of the one before. */
  private async beam(countMax: number): Promise<Candidate | null> {
    const { links, control } = this.options;
    let kept = await this.fitAll([{ pairs: [], start: null }], 0);
    let best = this.note(kept);
    if (best) return best;
    for (let count = 1; count <= countMax; count++) {
      if (control.stopped()) return null;
      control.report({ stage: `placing ${count} entanglers` });
      const seen = new Set<string>();
      const next: { pairs: Pair[]; start: Float64Array | null }[] = [];
      for (const { pairs, angles } of kept) {
        for (const link of links) {
          const longer = [...pairs, link];
          const key = placementKey(longer);
          if (seen.has(key) || isWasteful(longer)) continue;
          seen.add(key);
          next.push({ pairs: longer, start: angles });
        }
      }
      // warm starts first, then one fresh start each
      const warm = next.map(({ pairs, start }) => ({ pairs, start }));
      const fresh = next.map(({ pairs }) => ({ pairs, start: null }));
      kept = await this.fitAll([...warm, ...fresh], count);
      best = this.note(kept);
      if (best) return best;
      const unique = new Map<string, Candidate>();
      for (const candidate of kept) {
        const key = placementKey(candidate.pairs);
        if (!unique.has(key)) unique.set(key, candidate);
      }
      if (unique.size > BEAM) this.isExhausted = false;
      kept = [...unique.values()].slice(0, BEAM);
    }
    return null;
  }

  /** Cyclic and random placements with this many entanglers, from random starts. */
  private async placements(count: number, starts: number): Promise<Candidate | null> {
    const { links, seed, control } = this.options;
    control.report({ stage: `fitting ${count} entanglers` });
    const list: { pairs: Pair[]; start: null }[] = [];
    for (let k = 0; k < starts; k++) {
      const draw = random(seed, 'placement', count, k);
      const pairs: Pair[] = [];
      while (pairs.length < count) {
        const cyclic = links[(pairs.length + k) % links.length]!;
        const any = links[Math.floor(draw() * links.length)]!;
        pairs.push(k % 3 === 2 ? any : cyclic);
      }
      list.push({ pairs, start: null });
    }
    return this.note(await this.fitAll(list, count));
  }

  /** Fits a list of placements; results by distance, ties in list order. */
  private async fitAll(
    list: readonly { pairs: Pair[]; start: Float64Array | null }[],
    count: number,
  ): Promise<Candidate[]> {
    const { seed, optimiser, runJobs, control } = this.options;
    const templates = list.map(({ pairs }) => this.templateOf(pairs));
    const jobs = list.map(({ start }, k): FitJob => {
      const size = angleCount(templates[k]!);
      const warm = start ? extended(start, size) : null;
      return {
        kind: 'fit',
        id: `${count} entanglers/${k}`,
        seed,
        template: templates[k]!,
        target: this.target,
        ...(warm ? { start: warm, perturbation: 0.3 } : {}),
        optimiser,
        goal: GOAL,
        iterationsMax: ITERATIONS_MAX,
      };
    });
    const enough = (result: FitResult): boolean => result.distance <= this.options.tolerance;
    const results = await runJobs<FitJob, FitResult>(jobs, { control, enough });
    const found: Candidate[] = [];
    results.forEach((result, k) => {
      if (!result || !Number.isFinite(result.distance)) return;
      const { angles, distance, iterations, status } = result;
      found.push({ pairs: list[k]!.pairs, angles, distance, iterations, status });
    });
    return found.sort((a, b) => a.distance - b.distance);
  }

  private templateOf(pairs: readonly Pair[]): Template {
    const placed = pairs.map(([a, b]): [number, number] => [
      this.order.indexOf(a),
      this.order.indexOf(b),
    ]);
    return entanglerTemplate(this.wanted.wires, placed, this.options.entangler);
  }

  /** Keeps the best for the frontier; the candidate itself when it is good enough. */
  private note(found: readonly Candidate[]): Candidate | null {
    const [best] = found;
    if (!best) return null;
    const before = this.frontier.get(best.pairs.length);
    if (!before || best.distance < before.distance) this.frontier.set(best.pairs.length, best);
    return best.distance <= this.options.tolerance ? best : null;
  }

  private answer(found: Candidate | null): Synthesis {
    const rows = [...this.frontier.entries()].sort(([a], [b]) => a - b);
    const best = found ?? rows.map(([, row]) => row).sort((a, b) => a.distance - b.distance)[0];
    if (!best) throw new Error(`internal: no fit was tried on ${this.wanted.wires} wires`);
    const used = best.pairs.length;
    const isProven = found !== null && used === 0;
    const isGeneric = found !== null && used === this.generic && !this.isExhausted;
    const bound = isGeneric ? this.generic : found && this.isExhausted ? used : 0;
    const operations = templateOperations(this.templateOf(best.pairs), best.angles).map(
      (operation) => ({ ...operation, wires: operation.wires.map((w) => this.order[w]!) }),
    );
    return {
      operations,
      bound,
      boundKind: isProven || isGeneric ? 'proven' : this.isExhausted && found ? 'exhausted below' : 'found', // biome-ignore format: one choice
      frontier: rows.map(([entanglers, { distance }]) => ({ entanglers, distance })),
      fits: [
        {
          block: 0,
          wires: this.order.slice().sort((a, b) => a - b),
          entanglers: used,
          iterations: best.iterations,
          distance: best.distance,
          status: best.status,
        },
      ],
      notes: isGeneric
        ? ['the bound holds for generic targets of this size (dimension counting)']
        : this.isCxLike
          ? []
          : ['the bound for this entangler counts six angles each'],
      isStopped: this.options.control.stopped(),
    };
  }
}

/** Angles for a longer template: those known, and zeros. */
function extended(start: Float64Array, size: number): Float64Array {
  const out = new Float64Array(size);
  out.set(start.subarray(0, size));
  return out;
}

/** Four in a row on one pair are three at most (any two-wire gate needs no more than three CX). */
function isWasteful(pairs: readonly Pair[]): boolean {
  const [a, b, c, d] = pairs.slice(-4);
  const same = (p: Pair | undefined, q: Pair | undefined): boolean =>
    p !== undefined && q !== undefined && p[0] === q[0] && p[1] === q[1];
  return same(a, b) && same(b, c) && same(c, d);
}

/** Placements that differ only in the order of pairs without a common wire have one key. */
function placementKey(pairs: readonly Pair[]): string {
  const level = new Map<number, number>();
  const placed = pairs.map(([a, b]) => {
    const at = Math.max(level.get(a) ?? 0, level.get(b) ?? 0) + 1;
    level.set(a, at);
    level.set(b, at);
    return `${String(at).padStart(3, '0')}:${a}-${b}`;
  });
  return placed.sort().join(' ');
}

/** Wires that start in |0> first, each group ascending; the place of a wire in it is its wire in the template. */
function wireOrder({ wires, columns }: Wanted): number[] {
  const all = Array.from({ length: wires }, (_, k) => k);
  const isZero = (wire: number): boolean =>
    columns.every((column) => (column & (2 ** (wires - 1 - wire))) === 0);
  return [...all.filter(isZero), ...all.filter((wire) => !isZero(wire))];
}

/** The wanted columns with rows and columns in the order of the template's wires. */
function reordered(wanted: Wanted, order: readonly number[]): Float64Array {
  const { wires, columns } = wanted;
  const d = 2 ** wires;
  const c = columns.length;
  const move = (state: number): number =>
    order.reduce(
      (sum, wire, k) => sum + (state & (2 ** (wires - 1 - wire)) ? 2 ** (wires - 1 - k) : 0),
      0,
    );
  const from = wantedColumns(wanted);
  const rank = columns.map(move);
  const out = new Float64Array(2 * d * c);
  for (let r = 0; r < d; r++) {
    rank.forEach((to, k) => {
      out[move(r) * c + to] = from[r * c + k]!;
      out[d * c + move(r) * c + to] = from[d * c + r * c + k]!;
    });
  }
  return out;
}
