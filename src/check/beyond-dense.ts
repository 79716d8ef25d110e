/**
 * The roads for circuits whose matrices do not fit: tableaus for Clifford circuits, gates cancelled against gates, pieces
 * against pieces, sums over paths, and the few gates in which two long circuits differ. Each says what it proves in its own file.
 */
import { wireName } from '../circuit/circuit.ts';
import type { Witness } from '../reports.ts';
import { type Answer, distances, type Question, undecided } from './answer.ts';
import { compareGateByGate } from './gate-by-gate.ts';
import { localDifference } from './local-difference.ts';
import { bitPairs } from './observation.ts';
import { comparePathSums } from './path-sum.ts';
import { comparePieces } from './piece-by-piece.ts';
import { type Sides, sidesOf } from './sides.ts';
import { compareTableaus } from './tableau.ts';

/** The first road that leads to an answer, or null. */
export function answerBeyondDense(question: Question): Answer | null {
  const found = firstAnswer(question);
  // outputs in another order are looked for by the dense road only
  return question.relabel && found?.verdict === 'different' ? null : found;
}

/** A proof that two blocks are the same because nearly all of their gates are; null when it takes more to tell. */
export function sameByGates(question: Question): Answer | null {
  const { original, rewritten, contract } = question;
  const sides = sidesOf(original, rewritten, contract, bitPairs(original, rewritten));
  if (!sides?.isWhole) return null;
  const local = localAnswer(question, sides);
  return local?.verdict === 'same' ? local : gateByGateAnswer(question, sides);
}

function firstAnswer(question: Question): Answer | null {
  const { original, rewritten, contract } = question;
  const byTableau = tableauAnswer(question);
  if (byTableau) return byTableau;
  const sides = sidesOf(original, rewritten, contract, bitPairs(original, rewritten));
  if (!sides) return null;
  return (
    gateByGateAnswer(question, sides) ??
    piecesAnswer(question, sides) ??
    pathSumAnswer(question, sides) ??
    localAnswer(question, sides)
  );
}

/** Clifford circuits of any size, proved both ways. */
function tableauAnswer({ original, rewritten, contract }: Question): Answer | null {
  const found = compareTableaus(original, rewritten, contract, bitPairs(original, rewritten));
  if (!found) return null;
  const { isSame, generators, witness } = found;
  return {
    ...undecided(
      generators > 0
        ? `Clifford circuits: ${generators} independent stabilisers of what can be seen were compared`
        : 'Clifford circuits: no parity of what can be seen is fixed in the original',
    ),
    verdict: isSame ? 'same' : 'different',
    distance: isSame ? distances(0, 0, 0) : null,
    method: 'tableau',
    proof: true,
    witness,
    unfoldedWires: original.wires,
  };
}

function gateByGateAnswer({ original, tolerance }: Question, sides: Sides): Answer | null {
  const found = compareGateByGate(sides);
  if (!found || found.hilbertSchmidt > tolerance) return null;
  const { hilbertSchmidt, cancelled, rest } = found;
  return {
    ...undecided(
      `${cancelled} gates of the original were found again, up to commutation and what the contract cannot see${rest > 0 ? `; the ${rest} gates left were compared densely` : ''}; the distance is a bound`,
    ),
    verdict: 'same',
    distance: distances(hilbertSchmidt, null),
    method: 'gate by gate',
    proof: true,
    unfoldedWires: original.wires,
  };
}

function piecesAnswer({ original, tolerance }: Question, sides: Sides): Answer | null {
  const found = comparePieces(sides);
  if (!found || found.hilbertSchmidt > tolerance) return null;
  const { hilbertSchmidt, pieces, longest } = found;
  return {
    ...undecided(
      `${pieces} pieces of at most ${longest} gates were found again, each compared densely; the distance is a bound`,
    ),
    verdict: 'same',
    distance: distances(hilbertSchmidt, null),
    method: 'piece by piece',
    proof: true,
    unfoldedWires: original.wires,
  };
}

/** Affine maps, phases and Hadamards: a proof both ways when all is seen, of equality when it is not. */
function pathSumAnswer({ original, tolerance }: Question, sides: Sides): Answer | null {
  const found = comparePathSums(sides.left, sides.right, sides.lines, sides.zeroLines);
  if (!found) return null;
  const { hilbertSchmidt } = found;
  const isSame = hilbertSchmidt === null ? found.isSame : hilbertSchmidt <= tolerance;
  if (!isSame && !sides.isWhole) return null;
  return {
    ...undecided(`${found.variables} path variables were summed out`),
    verdict: isSame ? 'same' : 'different',
    distance: hilbertSchmidt === null ? null : distances(hilbertSchmidt, null),
    method: 'path sum',
    proof: true,
    witness: found.isSame || isSame ? null : witnessOf(original, found),
    unfoldedWires: original.wires,
  };
}

function localAnswer({ original, tolerance }: Question, sides: Sides): Answer | null {
  const found = localDifference(sides);
  if (!found) return null;
  const { hilbertSchmidt, errorBar, cancelled, rest } = found;
  const isSame = hilbertSchmidt + errorBar <= tolerance;
  if (!isSame && hilbertSchmidt - errorBar <= tolerance) return null;
  return {
    ...undecided(
      `${cancelled} gates of the original were found again; the ${rest} gates that are left of both were compared densely`,
    ),
    verdict: isSame ? 'same' : 'different',
    distance: distances(hilbertSchmidt, errorBar),
    method: 'local',
    proof: true,
    witness: isSame ? null : witnessOf(original, found),
    unfoldedWires: original.wires,
  };
}

/** An input that comes back after the original and its inverse, and less often after the other circuit in its place. */
function witnessOf(
  original: Question['original'],
  { input, again, isInverseFirst = false }: { input: { one: number[]; plus: number[] }; again: number; isInverseFirst?: boolean }, // biome-ignore format: one line
): Witness {
  const names = (lines: readonly number[]): string =>
    lines.map((line) => wireName(original, line)).join(' ');
  const parts = [
    ...(input.one.length > 0 ? [`${names(input.one)} in |1>`] : []),
    ...(input.plus.length > 0 ? [`${names(input.plus)} in |+>`] : []),
  ];
  return {
    input: parts.length > 0 ? `${parts.join(', ')}, all other wires in |0>` : 'all wires in |0>',
    output: isInverseFirst
      ? 'the input again, when it takes the inverse and then the original'
      : 'the input again, when the inverse of the original follows',
    probabilityOriginal: 1,
    probabilityRewritten: again,
  };
}
