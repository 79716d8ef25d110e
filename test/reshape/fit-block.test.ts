import { describe, expect, test } from 'vitest';
import { gate } from '../../src/circuit/circuit.ts';
import { applyGateInto } from '../../src/circuit/unitary.ts';
import { adjoint, mul } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { type FitJob, fitBlock } from '../../src/reshape/fit-block.ts';
import { FitObjective } from '../../src/reshape/objective.ts';
import { angleCount, entanglerTemplate, templateUnitary } from '../../src/reshape/template.ts';

const template = entanglerTemplate(2, [
  [0, 1],
  [1, 0],
  [0, 1],
]);
const matrix = haarUnitary(4, random(3, 'target'));

function job(optimiser: FitJob['optimiser'], k: number): FitJob {
  return {
    kind: 'fit',
    id: `fit ${k}`,
    seed: 1,
    template,
    target: { kind: 'unitary', matrix },
    optimiser,
    goal: 1e-11,
    iterationsMax: 20_000,
  };
}

describe.each(['lm', 'bfgs', 'lbfgs', 'nelder-mead'] as const)('a fit by %s', (optimiser) => {
  test('reaches a random two-wire gate with three CX and reports the distance it has', async () => {
    let best = Number.POSITIVE_INFINITY;
    for (let k = 0; k < 4 && best > 1e-9; k++) {
      const found = await fitBlock(job(optimiser, k));
      const made = templateUnitary(template, found.angles);
      const reached = hilbertSchmidtDistance(matrix, made).distance;
      expect(Math.abs(found.distance - reached)).toBeLessThan(1e-12);
      best = Math.min(best, reached);
    }
    expect(best).toBeLessThan(1e-9);
  });

  test('keeps frozen angles', async () => {
    const frozen = new Uint8Array(angleCount(template));
    frozen[0] = 1;
    frozen[7] = 1;
    const start = Float64Array.from(frozen, (_, k) => 0.3 * k - 1);
    const found = await fitBlock({ ...job(optimiser, 0), start, frozen, iterationsMax: 20 });
    expect(found.angles[0]).toBeCloseTo(start[0]!, 12);
    expect(found.angles[7]).toBeCloseTo(start[7]!, 12);
    expect(found.angles[3]).not.toBeCloseTo(start[3]!, 6);
  });
});

test('the gradient of every kind of target agrees with finite differences', () => {
  const targets = [
    { kind: 'unitary', matrix },
    {
      kind: 'columns',
      matrix: Float64Array.from({ length: 8 }, (_, k) => matrix[4 * k]!),
      columns: 1,
    },
    {
      kind: 'carry',
      pulled: (['X', 'Z'] as const).map((pauli) => {
        const moved = matrix.slice();
        applyGateInto(moved, gate(pauli.toLowerCase(), [1]), 2, 4);
        return { pauli, wire: 1, matrix: mul(adjoint(matrix, 4), moved, 4) };
      }),
    },
  ] as const;
  for (const target of targets) {
    const objective = new FitObjective(template, target);
    const draw = random(9, target.kind);
    const x = Float64Array.from({ length: objective.size }, () => 2 * draw() - 1);
    const gradient = new Float64Array(objective.size);
    objective.valueAndGradient(x, gradient);
    for (let k = 0; k < x.length; k++) {
      const [up, down] = [1e-6, -1e-6].map((h) =>
        objective.value(x.map((v, i) => (i === k ? v + h : v))),
      );
      expect(Math.abs(gradient[k]! - (up! - down!) / 2e-6)).toBeLessThan(1e-8);
    }
  }
});
