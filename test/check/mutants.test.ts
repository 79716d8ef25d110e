/**
 * A mutation run: narrowed circuits are spoiled in every way a slip could, and the check must see each one. What is truly
 * equal is decided by another simulation (branch by branch, on random inputs), which shares no code with the check.
 */
import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { InputError } from '../../src/input-error.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';
import { outcomeGap, randomInputs, simulate } from '../plan/branch-simulation.ts';

const MUTANTS = 2000;
const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));

function program(seed: number): { original: Circuit; options: ContractOptions } {
  const draw = random(seed, 'program');
  const n = 3 + whole(draw, 2);
  const isMeasured = seed % 3 !== 0;
  const operations: Operation[] = [];
  for (let k = 0; k < 9; k++) {
    const a = whole(draw, n - 1);
    const kind = whole(draw, 5);
    if (kind === 0) operations.push(gate('ry', [a], 0.3 + 2 * draw()));
    else if (kind === 1) operations.push(gate('h', [a + 1]));
    else if (kind === 2) operations.push(gate('cp', [a, a + 1], 0.3 + 2 * draw()));
    else operations.push(gate('cx', [a, a + 1]));
  }
  if (isMeasured) for (let w = 0; w < n; w++) operations.push({ kind: 'measure', wire: w, bit: w });
  const original = { ...emptyCircuit(n, isMeasured ? n : 0), operations };
  return { original, options: isMeasured && seed % 2 === 0 ? { inputs: 'any' } : {} };
}

type Mutant = { kind: string; circuit: Circuit };

function mutant({ operations, ...rest }: Circuit, draw: Random): Mutant | null {
  const list = [...operations];
  const k = whole(draw, list.length);
  const operation = list[k]!;
  const made = (kind: string, changed: Operation[]): Mutant => ({
    kind,
    circuit: { ...rest, operations: changed },
  });
  const put = (...replacement: Operation[]): Operation[] => [
    ...list.slice(0, k),
    ...replacement,
    ...list.slice(k + 1),
  ];
  switch (whole(draw, 7)) {
    case 0:
      if (operation.kind !== 'gate' || operation.angles.length === 0) return null;
      return made('angle', put({ ...operation, angles: operation.angles.map((x) => x + 0.05) }));
    case 1: {
      const next = list[k + 1];
      if (!next) return null;
      // a measurement and a reset that change places leave the other simulation without a rule for kept outputs
      if (operation.kind !== 'gate' && next.kind !== 'gate') return null;
      return made('order', [...list.slice(0, k), next, operation, ...list.slice(k + 2)]);
    }
    case 2:
      if (operation.kind !== 'gate' || rest.wires < 2) return null;
      return made(
        'wire',
        put({ ...operation, wires: operation.wires.map((w) => (w + 1) % rest.wires) }),
      );
    case 3:
      if (operation.kind !== 'reset') return null;
      return made('reset', put());
    case 4:
      if (!operation.condition) return null;
      return made(
        'condition',
        put({ ...operation, condition: { kind: 'not', of: operation.condition } }),
      );
    case 5: {
      const other = list.findIndex((o, at) => at !== k && o.kind === 'measure');
      const second = list[other];
      if (operation.kind !== 'measure' || second?.kind !== 'measure') return null;
      const swapped = [...list];
      swapped[k] = { ...operation, bit: second.bit };
      swapped[other] = { ...second, bit: operation.bit };
      return made('bits', swapped);
    }
    default:
      if (operation.kind !== 'gate') return null;
      return made('gone', put());
  }
}

/** A kept output is the qubit at its measurement; the other simulation takes it when its wire is reset. */
function isTouchedAfterLeaving({ operations, wires }: Circuit): boolean {
  const hasLeft = new Uint8Array(wires);
  for (const operation of operations) {
    if (operation.kind === 'measure') hasLeft[operation.wire] = 1;
    else if (operation.kind === 'reset') hasLeft[operation.wire] = 0;
    else if (operation.kind === 'gate' && operation.wires.some((w) => hasLeft[w])) return true;
  }
  return false;
}

/** Equal on random inputs, by the other simulation; null where a mutant makes no sense to it. */
function isTrulyEqual(a: Circuit, b: Circuit, options: ContractOptions): boolean | null {
  const contract = contractOf(a, options);
  try {
    for (let seed = 0; seed < 3; seed++) {
      const inputs = randomInputs(contract, seed);
      const gap = outcomeGap(simulate(a, inputs, contract, a.bits), simulate(b, inputs, contract, a.bits)); // biome-ignore format: one comparison
      if (gap > 1e-9) return false;
    }
    return true;
  } catch {
    // an output that never leaves, or leaves twice, has no outcome to compare
    return null;
  }
}

test(`${MUTANTS} mutants of narrowed circuits: every one that is different is seen`, () => {
  const score = new Map<string, { seen: number; equal: number; refused: number }>();
  let count = 0;
  for (let seed = 0; count < MUTANTS; seed++) {
    const { original, options } = program(seed);
    const slim = narrowByStructure(original, contractOf(original, options), {}).circuit;
    const text = writeCircuit(slim);
    const narrowed = readCircuit(text, 'narrowed.qasm').circuit;
    expect(compareCircuits(original, narrowed, { contract: options }).verdict).toBe('same');
    const draw = random(seed, 'mutants');
    for (let k = 0; k < 60 && count < MUTANTS; k++) {
      const made = mutant(narrowed, draw);
      if (!made) continue;
      // an input that may be anything and never enters cannot be the same, whatever state the other simulation puts there
      const isLost = made.kind === 'reset' && contractOf(original, options).inputs.includes('any');
      const truth = isLost ? false : isTrulyEqual(original, made.circuit, options);
      const isKept = contractOf(original, options).outputs.includes('kept');
      if (truth === null || (isKept && isTouchedAfterLeaving(made.circuit))) continue;
      count++;
      const row = score.get(made.kind) ?? { seen: 0, equal: 0, refused: 0 };
      score.set(made.kind, row);
      try {
        const { verdict } = compareCircuits(original, made.circuit, { contract: options });
        if (verdict !== (truth ? 'same' : 'different')) {
          throw new Error(`seed ${seed}, mutant ${k} (${made.kind}): the check says ${verdict}, the simulation ${truth ? 'same' : 'different'}`); // biome-ignore format: one sentence
        }
        if (truth) row.equal++;
        else row.seen++;
      } catch (error) {
        // refusing a circuit that makes no sense is seeing it
        if (!(error instanceof InputError)) throw error;
        row.refused++;
      }
    }
  }
  const rows = [...score].map(([kind, { seen, equal, refused }]) => `${kind}: ${seen} seen, ${equal} equal circuits, ${refused} refused`); // biome-ignore format: one line
  console.info(`mutants: ${count}, missed: 0; ${rows.join('; ')}`);
  for (const kind of ['angle', 'order', 'wire', 'reset', 'condition', 'bits', 'gone']) {
    const { seen = 0, refused = 0 } = score.get(kind) ?? {};
    expect(seen + refused, kind).toBeGreaterThan(0);
  }
}, 120_000);
