/**
 * Searches for few entanglers of a target by fitting templates at rising counts.
 *
 * Method: for each count, templates with different placements of the pairs are fitted, cheap for special targets: a beam
 * keeps the placements that came nearest, and the next count extends each of them by one more pair on every link, started
 * from its angles. When the beam ends, or at once where nothing special shows, cyclic and random placements at the bound by
 * dimension are fitted from random starts (`wanted.ts`).
 * How the count is known: `proven` when it meets a theorem's bound, `exhausted below` when every placement of fewer was
 * tried, else `found`.
 * Every batch is decided in list order, so the answer does not depend on the number of workers.
 */
import { type GateOperation, onWires } from '../circuit/circuit.ts';
import type { Control } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import { random } from '../numeric/random.ts';
import type { FitRow } from '../reports.ts';
import type { FitJob, FitTarget } from '../reshape/fit-block.ts';
import {
  beamOfPlacements,
  descend,
  type FitSettings,
  fitPlacements,
  type Pair,
  type Placement,
  shorten,
  structuredDistance,
} from '../reshape/placement-beam.ts';
import {
  type Entangler,
  entanglerTemplate,
  type Template,
  templateOperations,
} from '../reshape/template.ts';
import { templateAngles } from './template-angles.ts';
import { anglesEach, passingOf } from './two-wire.ts';
import { dimensionBound, reordered, type Wanted, wireOrder } from './wanted.ts';

export type SynthesisOptions = {
  entangler: Entangler;
  links: readonly Pair[];
  entanglersMax?: number;
  tolerance: number;
  seed: number;
  optimiser: FitJob['optimiser'];
  runJobs: RunJobs;
  control: Control;
  /** A placement that is known to do, for example that of the circuit as written. */
  hint?: readonly Pair[];
  /** The hint as a circuit in uses of the entangler, where there is one: its angles are a start that does. */
  hintGates?: readonly GateOperation[];
  /** A part of a larger whole: few entanglers will do, no need to show that fewer do not. */
  isPart?: boolean;
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
/** The same on four wires and more, where a level costs much more. */
const SEARCH_MAX_WIDE = 7;
const HINT_STARTS = 6;
/** Ways down from a placement that does: removals begin at different places. On more wires a way takes minutes. */
const DESCENTS = 5;
const DESCENT_WIRES_MAX = 4;
const DESCENT_COUNT_MAX = 24;
/** So many of the shortest ends are gone on from with moves. */
const ENDS_MAX = 2;
const GENERIC_STARTS = 12;
/** Few entanglers are quick to fit, and which placement does is then a matter of luck. */
const QUICK_COUNT_MAX = 13;
const QUICK_STARTS = 48;
/** On five wires a fit takes a minute: a few entanglers to spare make the first start do. */
const LARGE_WIRES = 5;
const LARGE_SPARE = 4;
const LARGE_STARTS = 2;

export function exact(operations: GateOperation[], bound: number): Synthesis {
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

/** One search: its settings, and the nearest placement per count for the frontier. */
export class Search {
  private readonly frontier = new Map<number, Placement>();
  private readonly target: FitTarget;
  private readonly order: number[];
  private readonly wanted: Wanted;
  private readonly options: SynthesisOptions;
  private readonly generic: number;
  private readonly anglesEach: number;
  private isExhausted = true;
  /** Random starts for every smaller placement, at least, where all were tried. */
  private starts = 0;

  constructor(wanted: Wanted, options: SynthesisOptions) {
    this.wanted = wanted;
    this.options = options;
    this.anglesEach = anglesEach(options.entangler);
    const d = 2 ** wanted.wires;
    this.generic = dimensionBound(wanted.wires, wanted.columns.length, this.anglesEach);
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
    const isSpecial = isSmall || this.looksSpecial();
    if (isSpecial || this.wanted.wires === 3) {
      const widest = this.wanted.wires > 3 ? SEARCH_MAX_WIDE : SEARCH_MAX;
      const most = Math.min(entanglersMax, isSmall ? this.generic + 4 : widest);
      const found = await this.beam(most, isSpecial ? undefined : structuredDistance);
      if (found) return this.answer(found);
    }
    this.isExhausted = false;
    const hinted = await this.fromHint();
    if (hinted && hinted.pairs.length <= entanglersMax) return this.answer(hinted);
    if (entanglersMax < this.generic) {
      await this.placements(entanglersMax, GENERIC_STARTS);
      return this.answer(null);
    }
    const isLarge = this.wanted.wires >= LARGE_WIRES && this.generic + LARGE_SPARE <= entanglersMax;
    const isQuick = this.generic <= QUICK_COUNT_MAX;
    const starts = isLarge ? LARGE_STARTS : isQuick ? QUICK_STARTS : GENERIC_STARTS;
    for (let spare = isLarge ? LARGE_SPARE : 0; spare <= 2 * LARGE_SPARE; spare++) {
      if (this.options.control.stopped() || this.generic + spare > entanglersMax) break;
      if (!isLarge && spare > LARGE_SPARE) break;
      const found = await this.placements(this.generic + spare, starts);
      if (!found) continue;
      return this.answer(isSpecial ? await this.shortened(found) : found);
    }
    return this.answer(null);
  }

  /** Few distinct sizes among the entries: gates and Fourier transforms have it, generic unitaries do not. */
  private looksSpecial(): boolean {
    const { matrix } = this.wanted;
    const half = matrix.length / 2;
    const sizes = new Set<number>();
    for (let k = 0; k < half; k++) {
      sizes.add(Math.round(1e7 * Math.hypot(matrix[k]!, matrix[half + k]!)));
    }
    return sizes.size <= half / 4;
  }

  private get fitting(): FitSettings {
    const { tolerance, seed, optimiser, runJobs, control } = this.options;
    return {
      label: 'the block',
      target: this.target,
      templateOf: (pairs) => this.templateOf(pairs),
      tolerance,
      seed,
      optimiser,
      runJobs,
      control,
    };
  }

  private async beam(
    countMax: number,
    farAt?: (count: number) => number,
  ): Promise<Placement | null> {
    const { links } = this.options;
    const limits = { links, countMax, ...(farAt ? { farAt } : {}) };
    const found = await beamOfPlacements({ ...this.fitting, ...limits });
    this.note(found.levels);
    if (!found.best) return null;
    if (this.options.isPart) {
      this.isExhausted = false;
      return found.best;
    }
    const { best, isExhausted, starts } = await descend(found.best, { ...this.fitting, ...limits });
    this.isExhausted = isExhausted;
    this.starts = starts;
    this.note([best]);
    return best;
  }

  /** From the hint alone: as short as it can be made; the nearest fit when it does not do. */
  async runFromHint(): Promise<Synthesis> {
    this.isExhausted = false;
    return this.answer(await this.fromHint());
  }

  /** The hint, when it fits and is shorter than what generic targets need, and then as short as it can be made. */
  private async fromHint(): Promise<Placement | null> {
    const { hint, tolerance } = this.options;
    if (!hint || hint.length >= this.generic) return null;
    const { hintGates } = this.options;
    const passing = passingOf(this.options.entangler);
    const known =
      hintGates &&
      templateAngles(hintGates, this.templateOf(hint), (side) => passing[side]?.sign ?? 1);
    const list = [
      ...(known ? [{ pairs: hint, start: known, isExact: true }] : []),
      ...Array.from({ length: HINT_STARTS }, () => ({ pairs: hint, start: null })),
    ];
    const [best] = await fitPlacements(list, {
      ...this.fitting,
      label: 'the placement as written',
    });
    return best && best.distance <= tolerance ? this.shortened(best) : null;
  }

  /** Several ways down, which end at different counts, and from the best of them with moves as well. */
  private async shortened(found: Placement): Promise<Placement> {
    const { fitting } = this;
    const isShort =
      found.pairs.length <= DESCENT_COUNT_MAX && this.wanted.wires <= DESCENT_WIRES_MAX;
    const ways = isShort ? DESCENTS : 1;
    const ends = [found];
    for (let way = 0; way < ways && !fitting.control.stopped(); way++) {
      const label = `${fitting.label}, way ${way + 1}`;
      const from = Math.floor((way * found.pairs.length) / ways);
      ends.push(await shorten(found, { ...fitting, label, from }));
    }
    const fewest = Math.min(...ends.map(({ pairs }) => pairs.length));
    const { links } = this.options;
    let best = ends.find(({ pairs }) => pairs.length === fewest)!; // the minimum is one of them
    for (const end of ends.filter(({ pairs }) => pairs.length === fewest).slice(0, ENDS_MAX)) {
      const shorter = await shorten(end, { ...fitting, links });
      if (shorter.pairs.length < best.pairs.length) best = shorter;
    }
    this.note([best]);
    return best;
  }

  /** Cyclic and random placements with this many entanglers, from random starts. */
  private async placements(count: number, starts: number): Promise<Placement | null> {
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
    const found = await fitPlacements(list, { ...this.fitting, label: 'the whole' });
    this.note(found);
    const [best] = found;
    return best && best.distance <= this.options.tolerance ? best : null;
  }

  private templateOf(pairs: readonly Pair[]): Template {
    const placed = pairs.map(([a, b]): [number, number] => [
      this.order.indexOf(a),
      this.order.indexOf(b),
    ]);
    return entanglerTemplate(this.wanted.wires, placed, this.options.entangler);
  }

  /** Every search tries a fit unless it is stopped before one ends; then no gates at all are the best so far. */
  private unfitted(): Synthesis {
    return {
      ...exact([], 0),
      boundKind: 'found',
      notes: ['stopped before a fit'],
      isStopped: true,
    };
  }

  /** Keeps the nearest of every count for the frontier. */
  private note(found: readonly Placement[]): void {
    for (const placement of found) {
      const before = this.frontier.get(placement.pairs.length);
      if (!before || placement.distance < before.distance) {
        this.frontier.set(placement.pairs.length, placement);
      }
    }
  }

  private answer(found: Placement | null): Synthesis {
    const rows = [...this.frontier.entries()].sort(([a], [b]) => a - b);
    const best = found ?? rows.map(([, row]) => row).sort((a, b) => a.distance - b.distance)[0];
    if (!best) return this.unfitted();
    const used = best.pairs.length;
    const isProven = found !== null && used === 0;
    const meetsBound = found !== null && used === this.generic && !this.isExhausted;
    // counting dimensions bounds generic targets only
    const isGeneric = meetsBound && !this.looksSpecial();
    const bound = isGeneric ? this.generic : found && this.isExhausted ? used : 0;
    const made = templateOperations(this.templateOf(best.pairs), best.angles);
    const operations = onWires(made, this.order);
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
      notes: this.exhaustedNotes(found, isProven).concat(
        isGeneric
          ? ['the bound holds for generic targets of this size (dimension counting)']
          : this.anglesEach === 4
            ? []
            : [`each use of ${this.options.entangler.name} brings ${this.anglesEach} open angles`],
      ),
      isStopped: this.options.control.stopped(),
    };
  }

  private exhaustedNotes(found: Placement | null, isProven: boolean): string[] {
    if (!found || !this.isExhausted || isProven || this.starts === 0) return [];
    return [
      `every placement of fewer entanglers was tried, with at least ${this.starts} starts each: evidence, not proof`,
    ];
  }
}
