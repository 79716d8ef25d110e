/**
 * Dynamic programs against a branch simulator in NumPy that knows nothing of the tool: the verdict and the distance of
 * `compareCircuits`, what the roads beyond dense size say, the probabilities of every string of bits, and the witness.
 */
import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { answerBeyondDense } from '../../src/check/beyond-dense.ts';
import { COMPARE_TOLERANCE, compareCircuits } from '../../src/check/compare.ts';
import { type Circuit, visibleBits } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions, InputRule, OutputRule } from '../../src/contract.ts';
import { bitDistribution } from '../../src/device/density.ts';
import { random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { python, pythonTest } from '../support/python.ts';
import {
  BITS,
  type Dice,
  diceOf,
  type Kind,
  programText,
  randomProgram,
  rewritten,
  type Statement,
  spoiled,
} from './random-programs.ts';

const PAIRS = 500;
const SIMULATOR = readFileSync(new URL('../support/branch-simulator.py', import.meta.url), 'utf8');

type Pair = {
  texts: [string, string];
  how: string;
  isRewriting: boolean;
  contract: ContractOptions;
  job: {
    wires: number;
    bits: number;
    allBits: number;
    any: number[];
    kept: number[];
    ended: number[];
    circuits: [Statement[], Statement[]];
  };
};

/** As the files decide; or inputs and outputs wire by wire; or all outputs measured. */
function randomContract(dice: Dice, wires: number): ContractOptions {
  const kind = dice.below(5);
  if (kind < 2) return {};
  const inputOf = new Map<number, InputRule>();
  const outputOf = new Map<number, OutputRule>();
  let [anyRoom, keptRoom] = [3, 3];
  for (let wire = 0; wire < wires; wire++) {
    inputOf.set(wire, dice.chance(0.6) && anyRoom-- > 0 ? 'any' : 'zero');
    if (kind === 2) continue;
    const isKept = dice.chance(0.6) && keptRoom-- > 0;
    outputOf.set(wire, isKept ? 'kept' : dice.pick(['measured', 'dropped'] as const));
  }
  if (kind === 2) return { inputOf, outputs: 'measured' };
  return { inputOf, outputOf };
}

/** Wires whose last statement measures them into a bit, as the text stands. */
function measuredLast(program: readonly Statement[]): Set<number> {
  const found = new Set<number>();
  const visit = (statement: Statement): void => {
    if (statement[0] === 'measure') found.add(statement[1]);
    else if (statement[0] === 'reset') found.delete(statement[1]);
    else if (statement[0] === 'gate') for (const wire of statement[4]) found.delete(wire);
    else if (statement[0] === 'if') [...statement[2], ...statement[3]].forEach(visit);
  };
  program.forEach(visit);
  return found;
}

const read = (text: string): Circuit => readCircuit(text, 'valley.qasm').circuit;

function pairOf(k: number, seed: number, kind: Kind): Pair {
  const dice = diceOf(random(seed, k));
  const wires = 2 + dice.below(4);
  const program = randomProgram(dice, wires, 5 + dice.below(kind === 'any' ? 16 : 10), kind);
  const isRewriting = k % 2 === 0;
  const other = isRewriting
    ? rewritten(program, dice, wires, 2 + dice.below(5), kind)
    : { ...spoiled(program, dice, wires, 2 + dice.below(4)), bits: BITS };
  const texts: [string, string] = [
    programText(program, wires, BITS),
    programText(other.program, wires, other.bits),
  ];
  const contract = randomContract(dice, wires);
  const { inputs, outputs } = contractOf(read(texts[0]), contract);
  const intoBits = measuredLast(program);
  const whose = (rule: string, list: readonly string[]): number[] =>
    list.flatMap((its, wire) => (its === rule ? [wire] : []));
  const ended = whose('measured', outputs).filter((wire) => !intoBits.has(wire));
  const how = 'slip' in other ? other.slip : other.rules.join(', ');
  const [any, kept] = [whose('any', inputs), whose('kept', outputs)];
  const circuits: [Statement[], Statement[]] = [program, other.program];
  const job = { wires, bits: BITS, allBits: other.bits, any, kept, ended, circuits };
  return { texts, how, isRewriting, contract, job };
}

type Truth = { trace: number; fidelity: number; weights: [Table, Table] };
type Table = { [bits: string]: number };

function verdictOf({ texts, contract }: Pair) {
  const [a, b] = [read(texts[0]), read(texts[1])];
  const report = compareCircuits(a, b, { contract });
  const question = {
    original: a,
    rewritten: b,
    contract: contractOf(a, contract),
    tolerance: COMPARE_TOLERANCE,
    relabel: false,
    seed: 1,
  };
  return { report, beyond: answerBeyondDense(question), original: a };
}

/** Both halves, rewritten and spoiled pairs, against the simulator; what came of them, counted. */
function score(count: number, seed: number, kind: Kind) {
  const pairs = Array.from({ length: count }, (_, k) => pairOf(k, seed, kind));
  const truths = python(
    SIMULATOR,
    pairs.map(({ job }) => job),
  ) as Truth[];
  expect(truths.length).toBe(count);
  const score = { same: 0, different: 0, witnesses: 0, distributions: 0, close: 0 };
  const roads = new Map<string, number>();
  pairs.forEach((pair, k) => {
    const truth = truths[k]!;
    const { report, beyond, original } = verdictOf(pair);
    const shown = { texts: pair.texts, how: pair.how, contract: pair.contract };
    // the simulator's own rewriting rules must hold, and what is different must be so clearly
    if (pair.isRewriting) expect({ ...shown, isEqual: truth.trace < 1e-10 }).toEqual({ ...shown, isEqual: true }); // biome-ignore format: one check
    const wanted = truth.trace < 1e-10 ? 'same' : 'different';
    if (truth.trace >= 1e-10 && truth.trace < 1e-4) score.close++;
    score[wanted]++;
    const off = report.distance!.hilbertSchmidt - (1 - truth.fidelity);
    const { verdict } = report;
    expect({ ...shown, verdict, isOff: Math.abs(off) > 1e-11 }).toEqual({ ...shown, verdict: wanted, isOff: false }); // biome-ignore format: one check
    if (beyond && beyond.verdict !== 'undecided') {
      const { method } = beyond;
      expect({ ...shown, method, verdict: beyond.verdict }).toEqual({ ...shown, method, verdict: wanted }); // biome-ignore format: one check
      roads.set(`${method}: ${wanted}`, (roads.get(`${method}: ${wanted}`) ?? 0) + 1);
    }
    if (pair.job.any.length > 0 || pair.job.kept.length > 0 || pair.job.ended.length > 0) return;
    score.distributions++;
    checkDistribution(original, truth.weights[0], shown);
    if (verdict === 'different') {
      score.witnesses++;
      checkWitness(report.witness!, truth.weights, shown);
    }
  });
  console.log(
    `dynamic programs (${kind}): ${JSON.stringify(score)}, other roads ${[...roads].map((r) => r.join(' ')).join(', ')}`,
  );
  expect(score.close).toBe(0);
  return score;
}

pythonTest(
  `${PAIRS} pairs of random dynamic programs (seed 500)`,
  () => {
    const { same, different, distributions, witnesses } = score(PAIRS, 500, 'any');
    expect(Math.min(same, different)).toBeGreaterThan(PAIRS / 4);
    expect(Math.min(distributions, witnesses)).toBeGreaterThan(20);
  },
  { timeoutMs: 240_000 },
);

pythonTest(
  '200 pairs of Clifford programs, of which tableaus prove a part (seed 501)',
  () => {
    const { same, different } = score(200, 501, 'clifford');
    expect(Math.min(same, different)).toBeGreaterThan(30);
  },
  { timeoutMs: 240_000 },
);

function checkDistribution(circuit: Circuit, truth: Table, shown: object): void {
  const seen = visibleBits(circuit);
  const ours = new Map<string, number>();
  for (const [bits, p] of bitDistribution(circuit)) {
    const key = seen.map((bit) => bits[bit]).join('');
    ours.set(key, (ours.get(key) ?? 0) + p);
  }
  let distance = 0;
  for (const key of new Set([...ours.keys(), ...Object.keys(truth)])) {
    distance += Math.abs((ours.get(key) ?? 0) - (truth[key] ?? 0)) / 2;
  }
  expect({ ...shown, isOff: distance > 1e-12 }).toEqual({ ...shown, isOff: false });
}

/** The witness names bits and the two probabilities of their values: both must be the simulator's. */
function checkWitness(
  witness: { output: string; probabilityOriginal: number; probabilityRewritten: number },
  [first, second]: [Table, Table],
  shown: object,
): void {
  const wanted = [...witness.output.matchAll(/c\[(\d)\]=([01])/g)];
  const weight = (table: Table): number =>
    Object.entries(table)
      .filter(([key]) => wanted.every(([, bit, value]) => key[Number(bit)] === value))
      .reduce((sum, [, p]) => sum + p, 0);
  const { output, probabilityOriginal: p, probabilityRewritten: q } = witness;
  const isRight = Math.abs(p - weight(first)) < 1e-11 && Math.abs(q - weight(second)) < 1e-11;
  expect({ ...shown, output, count: wanted.length > 0, isRight }).toEqual({ ...shown, output, count: true, isRight: true }); // biome-ignore format: one check
}

test('beyond dense size: a bit whose qubit nobody keeps is seen all the same', () => {
  const text = (angle: number): string =>
    programText(
      [
        ['gate', [], 'ry', [angle], [0]],
        ['gate', [], 'h', [], [1]],
        ['measure', 0, 0],
        ['gate', [], 'cp', [0.3], [0, 1]],
      ],
      2,
      BITS,
    );
  const [original, rewritten] = [read(text(0.5)), read(text(0.8))];
  const contract = contractOf(original);
  expect(contract.outputs).toEqual(['dropped', 'dropped']);
  const answer = answerBeyondDense({ original, rewritten, contract, tolerance: COMPARE_TOLERANCE, relabel: false, seed: 1 }); // biome-ignore format: one question
  expect(answer?.verdict).not.toBe('same');
});

describe('a kept output that is measured on its way', () => {
  const head = 'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[2] q;\nbit[2] c;\n';
  const kept = { inputs: 'any', outputs: 'kept' } as const;
  const compare = (a: string, b: string) =>
    compareCircuits(read(head + a), read(head + b), { contract: kept }).verdict;

  test('whoever keeps it sees that it was measured, even when nobody reads the bit', () => {
    expect(compare('c[0] = measure q[0]; t q[0];', 't q[0];')).toBe('different');
    expect(compare('c[0] = measure q[0]; t q[0]; c[0] = 0;', 't q[0];')).toBe('different');
    expect(compare('c[0] = measure q[0]; cz q[0], q[1];', 'cz q[0], q[1];')).toBe('different');
  });

  test.each([
    ['c[0] = measure q[0]; t q[0]; c[0] = measure q[1];', 't q[0]; c[0] = measure q[1];'],
    ['measure q[0]; h q[1]; t q[0];', 'h q[1]; t q[0];'],
    ['measure q[0]; h q[1]; s q[0];', 'h q[1]; s q[0];'],
  ])('the roads beyond dense size see it too: %s', (first, second) => {
    const [original, rewritten] = [read(head + first), read(head + second)];
    const contract = contractOf(original, kept);
    const question = { original, rewritten, contract, tolerance: COMPARE_TOLERANCE, relabel: false, seed: 1 }; // biome-ignore format: one question
    expect(answerBeyondDense(question)?.verdict).not.toBe('same');
    const again = answerBeyondDense({ ...question, rewritten: original });
    expect(again?.verdict ?? 'undecided').not.toBe('different');
  });

  test('what is diagonal on it may come before or after', () => {
    expect(compare('c[0] = measure q[0]; t q[0];', 's q[0]; c[0] = measure q[0]; id q[0];')).toBe(
      'same',
    );
    expect(compare('c[0] = measure q[0]; cz q[0], q[1];', 'c[0] = measure q[0]; if (c[0]) z q[1]; t q[0];')).toBe('same'); // biome-ignore format: one check
  });
});
