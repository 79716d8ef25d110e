import { describe, expect, test } from 'vitest';
import {
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { nativeSetOf } from '../../src/native/native-set.ts';
import { toNative } from '../../src/native/to-native.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const singles = (operations: readonly Operation[]): GateOperation[] =>
  operations.filter((o): o is GateOperation => o.kind === 'gate' && o.wires.length === 1);

/** Generic single-wire gates around two uses of the entangler. */
function generic(entangler: GateOperation, seed: number): GateOperation[] {
  const draw = random(seed, 'runs');
  const layer = (): GateOperation[] => [0, 1].map((w) => unitaryGate(haarUnitary(2, draw), [w]));
  return [...layer(), entangler, ...layer(), entangler, ...layer()];
}

describe('single-wire gates, fewest for the set', () => {
  // 3 per wire and 4 per CX: no circuit of rotations can do with fewer open angles (Shende, Markov, Bullock (2004))
  test.each([
    ['cx,rx,rz', 14],
    ['cz,rx,rz', 14],
    ['cx,ry,rz', 14],
    ['cx,rx,ry', 14],
    ['cx,u3', 6],
    // one turn about an axis in the plane for each of six runs, and one rotation about z at the end of each wire
    ['cz,prx,rz', 8],
    // rz sx rz sx wherever a rotation about z passes, and five gates at each end
    ['cz,rz,sx', 26],
  ])('%s: %i', (list, count) => {
    const [name] = list.split(',');
    for (let seed = 0; seed < 8; seed++) {
      const operations = generic(gate(name!, [0, 1]), seed);
      const native = toNative(operations, 2, nativeSetOf(list));
      expect(hilbertSchmidtDistance(unitaryOf(operations, 2), unitaryOf(native, 2)).distance).toBeLessThan(1e-25); // biome-ignore format: one check
      expect(singles(native)).toHaveLength(count);
    }
  });

  test('rz and sx around CX: open angles at their number', () => {
    const operations = generic(gate('cx', [0, 1]), 3);
    const native = toNative(operations, 2, nativeSetOf('cx,rz,sx'));
    expect(singles(native).filter(({ name }) => name === 'rz').length).toBeLessThanOrEqual(14);
    expect(singles(native).length).toBeLessThanOrEqual(26);
  });

  test('never more than each run on its own', () => {
    for (const list of ['cx,rz,sx', 'cx,rz,sx,x', 'cz,prx,rz', 'cx,rx,rz', 'iswap,u3']) {
      const set = nativeSetOf(list);
      const draw = random(9, list);
      const [name] = list.split(',') as [string];
      const names = ['h', 't', 's', 'x', 'sx'];
      for (let round = 0; round < 10; round++) {
        let turn = round;
        // no two entanglers in a row on one pair, which would be joined
        const operations = Array.from({ length: 24 }, () => {
          const a = Math.floor(3 * draw());
          const kind = names[Math.floor(draw() * names.length)]!;
          if (draw() < 0.6) return gate(kind, [a]);
          turn++;
          return gate(name, [turn % 3, (turn + 1) % 3]);
        });
        const native = toNative(operations, 3, set);
        expect(hilbertSchmidtDistance(unitaryOf(operations, 3), unitaryOf(native, 3)).distance).toBeLessThan(1e-24); // biome-ignore format: one check
        // barriers keep everything in its place
        const held = operations.flatMap((o): Operation[] =>
          o.wires.length === 2 ? [{ kind: 'barrier', wires: [0, 1, 2] }, o] : [o],
        );
        const apart = toNative(held, 3, set);
        expect(singles(native).length).toBeLessThanOrEqual(singles(apart).length);
      }
    }
  });

  test('what would pass into a measurement is dropped, into a condition it is not', () => {
    const set = nativeSetOf('cx,rz,sx');
    const before = [gate('rz', [0], 0.3), gate('cx', [0, 1])];
    const measured = toNative([...before, { kind: 'measure', wire: 0, bit: 0 }], 2, set);
    expect(singles(measured)).toHaveLength(0);
    const condition = { kind: 'bit', bit: 0 } as const;
    const kept = toNative([...before, { ...gate('sx', [0]), condition }], 2, set);
    expect(singles(kept).map(({ name }) => name)).toEqual(['rz', 'sx']);
  });
});
