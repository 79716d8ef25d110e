/** Answers as plain sentences. Everything the page says about a report is written here. */
import type { InputProblem } from '../input-error.ts';
import type { DistanceReport, NarrowReport, Pair, SurveyReport, WidthRow } from '../reports.ts';

export function count(n: number, one: string, many = `${one}s`): string {
  return `${n.toLocaleString('en')} ${n === 1 ? one : many}`;
}

/** A number for people: three figures, small ones with a power of ten. */
export function figure(x: number): string {
  if (x === 0) return '0';
  if (!Number.isFinite(x)) return 'not known';
  const size = Math.abs(x);
  if (size >= 0.001 && size < 1000) return `${Number(x.toPrecision(3))}`;
  const [digits = '', power = ''] = x.toExponential(1).split('e');
  return `${digits} × 10${superscript(Number(power))}`;
}

/** A probability with as many digits as it takes to tell it from another one, and two more. */
export function probability(x: number, other: number): string {
  const gap = Math.abs(x - other);
  const digits = gap === 0 ? 3 : Math.min(15, Math.max(3, Math.ceil(-Math.log10(gap)) + 2));
  return x.toFixed(digits);
}

function superscript(power: number): string {
  const digits = '⁰¹²³⁴⁵⁶⁷⁸⁹';
  const sign = power < 0 ? '⁻' : '';
  return sign + [...`${Math.abs(power)}`].map((digit) => digits[Number(digit)]).join('');
}

export const CONTRACT_WORDS: Readonly<Record<WidthRow['contract'], string>> = {
  'any/kept': 'any input, outputs kept',
  'any/measured': 'any input, outputs measured',
  'zero/kept': 'inputs |0⟩, outputs kept',
  program: 'as a program: inputs |0⟩, read as the file reads',
};

/** The number of wires a survey promises for the contract it was asked about. */
export function promisedWidth(report: SurveyReport): number {
  const { structure, early, causal } = report;
  const found = [structure.width];
  if (early) found.push(early.width);
  if (causal) found.push(causal.width);
  return Math.min(...found);
}

export function surveySentence(report: SurveyReport): string {
  const { counts, structure, early, causal } = report;
  const written = `It is written on ${count(counts.wires, 'wire')}.`;
  const byOrder = Math.min(structure.width, early?.width ?? Number.POSITIVE_INFINITY);
  const order =
    byOrder < counts.wires
      ? `In another order, its own gates fit on ${byOrder}.`
      : 'No order of its gates needs fewer.';
  if (!causal) return `${written} ${order}`;
  if (causal.width < byOrder) {
    const can =
      causal.width === 1
        ? 'an equal circuit fits on one'
        : `an equal circuit fits on ${causal.width}`;
    return `${written} ${order} But its matrix says that ${can}.`;
  }
  if (causal.how === 'exact' && causal.width >= counts.wires) {
    return `${written} ${order} And no equal circuit does: its matrix rules it out.`;
  }
  return `${written} ${order}`;
}

/** What a cell of the influence table means. */
export function cellSentence(
  report: SurveyReport,
  { leaves, enters }: Pair,
  names: readonly string[],
): string {
  const out = names[leaves] ?? `#${leaves}`;
  const into = names[enters] ?? `#${enters}`;
  const kind = cellKind(report, leaves, enters);
  if (kind === 'free') {
    return `${out} can leave before ${into} enters: no path of gates leads from ${into} to ${out}.`;
  }
  if (kind === 'opening') {
    return `The gates lead from ${into} to ${out}, but nothing of ${into} reaches ${out}: an equal circuit can let ${out} leave before ${into} enters.`;
  }
  const bound = report.influence?.table[leaves]?.[enters];
  if (bound === undefined) {
    return `A path of gates leads from ${into} to ${out}; influence was not measured here, so this is only what the order of the gates says.`;
  }
  const measure =
    report.influence?.kind === 'measured' ? 'the probability of its bit' : 'process infidelity';
  const sure = report.influence?.method === 'dense' ? 'at least' : 'about';
  if (leaves === enters) {
    return `${out} carries its own input: influence ${figure(bound)}.`;
  }
  return `No equal circuit lets ${out} leave before ${into} enters: any attempt is wrong by ${sure} ${figure(bound)} in ${measure}.`;
}

export type CellKind = 'free' | 'opening' | 'tied';

export function cellKind(report: SurveyReport, leaves: number, enters: number): CellKind {
  const isSame = (pair: Pair): boolean => pair.leaves === leaves && pair.enters === enters;
  if (report.openings.some(isSame)) return 'opening';
  return report.structure.reach[leaves]?.[enters] === false ? 'free' : 'tied';
}

export function narrowTitle({ verdict, before, after }: NarrowReport): string {
  if (verdict === 'narrowed' && after) {
    return `Narrowed: ${count(before.wires, 'wire')} became ${after.wires}.`;
  }
  if (verdict === 'impossible') return 'It cannot be narrowed like this.';
  return 'Undecided.';
}

export function sentence(text: string): string {
  const first = text.charAt(0).toUpperCase() + text.slice(1);
  return /[.!?]$/.test(first) ? first : `${first}.`;
}

export function bracketSentence({ bracket }: NarrowReport): string | null {
  // a road that is exactly open needs no bracket
  if (!bracket || bracket.lower === 0) return null;
  const least = `Every circuit of that kind is at a distance D of at least ${figure(bracket.lower)}`;
  if (bracket.reached === null) return `${least}.`;
  return `${least}; the nearest one found is at ${figure(bracket.reached)}.`;
}

export function checkSentence({ check, distance }: NarrowReport): string | null {
  if (!check) return null;
  const ground = check.proof ? 'which is a proof' : 'which is strong evidence, not a proof';
  const wires = count(check.unfoldedWires, 'unfolded wire');
  const worst =
    distance?.worstCase === null || distance?.worstCase === undefined
      ? ''
      : ` In the worst case the two differ by ${figure(distance.worstCase)}.`;
  return `The written text was read again, unfolded to ${wires}, and compared with the original (${check.method}), ${ground}: distance D = ${figure(check.distance)}.${worst}`;
}

/** Rows of numbers for a distance, with what each is. */
export function distanceRows(distance: DistanceReport): [string, string][] {
  const rows: [string, string][] = [
    ['Hilbert–Schmidt distance D', figure(distance.hilbertSchmidt)],
    ['process infidelity', figure(distance.processInfidelity)],
    ['angle', figure(distance.angle)],
  ];
  if (distance.worstCase !== null)
    rows.push(['worst case over all inputs', figure(distance.worstCase)]);
  if (distance.errorBar) rows.push(['bound on rounding in D', figure(distance.errorBar)]);
  return rows;
}

export function problemSentence({ message, line, column, hint }: InputProblem): string {
  const place =
    line === undefined ? '' : `Line ${line}${column === undefined ? '' : `, column ${column}`}: `;
  const advice = hint ? ` (${hint})` : '';
  return `${place}${message}${advice}`;
}
