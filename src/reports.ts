/**
 * The shapes of the reports: what each command answers, as JSON. The keys are part of the interface;
 * `schema` names the command and the version of its shape.
 */
import type { Counts } from './circuit/counts.ts';

type Head<Command extends string> = {
  schema: `wiregauge/${Command}@1`;
  seed: number;
  /** `any/kept`, `any/measured`, `zero/kept`, `zero/measured`, `program` or `mixed`. */
  contract: string;
  /** True when the file, not an option, decided the contract. */
  contractFromFile: boolean;
  /** Wall time; filled in by the shell, 0 from the core. */
  seconds: number;
  /** Things worth knowing that are no errors, in plain sentences. */
  notes: string[];
};

/** Output `leaves` can be gone before input `enters` comes: both are wire numbers of the original. */
export type Pair = { leaves: number; enters: number };

export type HowSure = 'exact' | 'upper' | 'lower';

export type WidthRow = {
  contract: 'any/kept' | 'any/measured' | 'zero/kept' | 'program';
  width: number;
  how: HowSure;
  /** Why it is that and no less or no more, in a sentence. */
  why: string;
};

export type SurveyReport = Head<'survey'> & {
  circuit: string;
  counts: Counts;
  structure: {
    width: number;
    method: string;
    how: HowSure;
    /** reach[out][in]: a path of gates leads from input `in` to output `out`. */
    reach: boolean[][];
    pairs: Pair[];
  };
  early: { width: number; method: string; how: HowSure } | null;
  /** Null when neither dense matrices nor probes were possible; `notes` then says why. */
  influence: {
    method: 'dense' | 'probes' | 'windows';
    kind: 'kept' | 'measured';
    /** kept: a lower bound on process infidelity; measured: on the error of the bit's probability. */
    table: number[][];
  } | null;
  causal: { width: number; method: string; how: HowSure; pairs: Pair[] } | null;
  /** Pairs that structure forbids and influence allows. */
  openings: Pair[];
  widths: WidthRow[];
  /** What fewer wires would cost at least, when dense influence is known. */
  approximate?: { wires: number; infidelityAtLeast: number }[];
};

export type DistanceReport = {
  hilbertSchmidt: number;
  processInfidelity: number;
  /** Half the diamond distance, sqrt(1 - r^2); null where it was not computed. */
  worstCase: number | null;
  angle: number;
  /** Bound on the rounding error of `hilbertSchmidt`; null where none is known. */
  errorBar?: number | null;
};

export type FitRow = {
  block: number;
  wires: number[];
  entanglers: number;
  iterations: number;
  distance: number;
  status: string;
};

/** A window of a large circuit that was reshaped: its wires (lines of single qubits, from 0), and what became of its gates. */
export type WindowRow = {
  wires: number[];
  gates: { before: number; after: number };
  entanglers: { before: number; after: number };
};

export type NarrowReport = Head<'narrow'> & {
  circuit: string;
  verdict: 'narrowed' | 'impossible' | 'undecided';
  reason: string;
  before: Counts;
  after: Counts | null;
  /** On which wire of the new circuit output `leaves` makes room for input `enters`. */
  reuse: { wire: number; leaves: number; enters: number }[];
  distance: DistanceReport | null;
  bracket: { lower: number; reached: number | null } | null;
  check: { method: string; proof: boolean; unfoldedWires: number; distance: number } | null;
  native: string;
  estimate: { before: number; after: number } | null;
  fits: FitRow[];
  windows: WindowRow[];
  files: string[];
};

export type Witness = {
  /** The input state in words and as one basis state or product state per wire. */
  input: string;
  /** The output, a bit string or an observable, where the probabilities differ most. */
  output: string;
  probabilityOriginal: number;
  probabilityRewritten: number;
};

/** Lines of a text, first and last. */
export type Stretch = { from: number; to: number } | null;

export type CompareReport = Head<'compare'> & {
  original: string;
  rewritten: string;
  verdict: 'same' | 'different' | 'undecided';
  distance: DistanceReport | null;
  /** Global phase: rewritten = e^{i phase} original. Null when it has no meaning. */
  phase: number | null;
  method: string;
  proof: boolean;
  witness: Witness | null;
  /** When different: the stretches of both texts, by lines, outside of which they agree; null for a circuit with no gate there. */
  where?: { original: Stretch; rewritten: Stretch } | null;
  /** relabelling[k] = output wire of the rewritten circuit that carries output k; null when not asked for. */
  relabelling: number[] | null;
};

export type BuildReport = Head<'build'> & {
  target: string;
  verdict: 'built' | 'approximate' | 'undecided';
  counts: Counts;
  distance: DistanceReport;
  entanglers: {
    used: number;
    /** A lower bound on the number needed. */
    bound: number;
    /** How the count is known: meets a theorem's bound, every smaller skeleton was tried, or just found. */
    boundKind: 'proven' | 'exhausted below' | 'found';
  };
  /** For whole two-wire targets: which class of gates that are equal up to single-wire gates it is in; else null. */
  canonical: {
    /** c1 >= c2 >= |c3| of exp(i(c1 XX + c2 YY + c3 ZZ)), in units of pi/4. */
    coordinates: [number, number, number];
    /** Re G1, Im G1, G2. */
    makhlin: [number, number, number];
  } | null;
  frontier: { entanglers: number; distance: number }[];
  fits: FitRow[];
  native: string;
  files: string[];
};
