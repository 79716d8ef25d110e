import { expect, test } from 'vitest';
import { emptyCircuit, type GateOperation, gate, unitaryGate } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { axisAngles, rotationMatrix } from '../../src/native/axis-angles.ts';
import { templateAngles } from '../../src/native/template-angles.ts';
import { passingOf } from '../../src/native/two-wire.ts';
import { mul } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { entanglerTemplate, templateUnitary } from '../../src/reshape/template.ts';

const distance = (u: Float64Array, v: Float64Array): number =>
  hilbertSchmidtDistance(u, v).distance;

test('rotations about any two axes recompose', () => {
  const draw = random(1, 'axes');
  for (const outer of ['x', 'y', 'z'] as const) {
    for (const inner of ['x', 'y', 'z'] as const) {
      if (inner === outer) continue;
      for (let k = 0; k < 10; k++) {
        const u = haarUnitary(2, draw);
        const [c, t, b] = axisAngles(u, outer, inner);
        const made = mul(rotationMatrix(outer, b), mul(rotationMatrix(inner, t), rotationMatrix(outer, c), 2), 2); // biome-ignore format: one product
        expect(distance(u, made)).toBeLessThan(1e-28);
      }
    }
  }
});

test.each(['cx', 'cz', 'ecr', 'cy', 'sqrtiswap', 'b'])(
  'a circuit of %s gives its template its angles',
  (name) => {
    const draw = random(2, name);
    for (let round = 0; round < 5; round++) {
      const operations: GateOperation[] = [];
      const pairs: [number, number][] = [];
      for (let k = 0; k < 9; k++) {
        operations.push(unitaryGate(haarUnitary(2, draw), [Math.floor(3 * draw())]));
        const a = Math.floor(3 * draw());
        const pair: [number, number] = [a, (a + 1 + Math.floor(2 * draw())) % 3];
        operations.push(gate(name, pair));
        pairs.push(pair);
      }
      operations.push(unitaryGate(haarUnitary(2, draw), [1]));
      const template = entanglerTemplate(3, pairs, { name });
      const passing = passingOf({ name });
      const angles = templateAngles(operations, template, (side) => passing[side]?.sign ?? 1)!;
      const u = circuitUnitary({ ...emptyCircuit(3), operations });
      expect(distance(u, templateUnitary(template, angles))).toBeLessThan(1e-26);
    }
  },
);
