/**
 * Finds a two-wire gate of a given class from few uses of any entangler, by a fit of the class alone.
 *
 * Shape: c is in radians and in the chamber of `canonical.ts`; the result is gates on wires 0 and 1 whose canonical
 * coordinates are c, or undefined when `USES_MAX` uses do not reach it.
 * Method: what can be told from the coordinates is told, the rest is fitted at rising counts: a template of uses with all
 * single-wire gates between them, by Levenberg-Marquardt, from no rotations and from random ones.
 *   no use       (0, 0, 0)
 *   one use      the entangler's own class
 *   sqrt(iSWAP)  two uses if and only if |c3| <= c1 - c2, else three (Huang et al., PRL 130, 070601 (2023))
 *   iSWAP        two uses if and only if c3 = 0, else three: it is a CX and a swap, and two swaps cancel
 *   B            two uses for every other class (Zhang, Vala, Sastry, Whaley, PRL 93, 020502 (2004))
 * Results are kept by class and entangler: the same question has the same answer, whoever asks first.
 */
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { freeRunning } from '../control.ts';
import { random } from '../numeric/random.ts';
import { levenbergMarquardt } from '../optimise/levenberg-marquardt.ts';
import { FitObjective } from '../reshape/objective.ts';
import {
  angleCount,
  type Entangler,
  entanglerMatrix,
  entanglerTemplate,
  templateOperations,
} from '../reshape/template.ts';
import { canonical, canonicalGate, WALL_TOLERANCE } from './canonical.ts';

type Coordinates = readonly [number, number, number];

const QUARTER = Math.PI / 4;
const USES_MAX = 8;
const STARTS = 12;
const ITERATIONS_MAX = 300;
/** A fit counts at this D. */
const DISTANCE_MAX = 1e-21;
const GOAL = 1e-29;
const MEMORY_MAX = 5000;

const memory = new Map<string, GateOperation[] | undefined>();

export function fittedCore(c: Coordinates, entangler: Entangler): GateOperation[] | undefined {
  const own = entangler.matrix ? `${entangler.name}/${entangler.matrix.join()}` : entangler.name;
  const key = `${own}/${c.join()}`;
  if (memory.has(key)) return memory.get(key);
  if (memory.size >= MEMORY_MAX) memory.clear();
  const core = findCore(c, entangler);
  memory.set(key, core);
  return core;
}

/** The uses that this class needs at least, as far as its coordinates tell. */
export function usesAtLeast(c: Coordinates, entangler: Entangler): number {
  if (isSame(c, [0, 0, 0])) return 0;
  if (entangler.angle === 'free') return 1;
  const own = canonical(entanglerMatrix(entangler)).c;
  if (isSame(c, own)) return 1;
  const [c1, c2, c3] = c;
  if (isSame(own, [QUARTER / 2, QUARTER / 2, 0])) {
    return Math.abs(c3) <= c1 - c2 + WALL_TOLERANCE ? 2 : 3;
  }
  if (isSame(own, [QUARTER, QUARTER, 0])) return Math.abs(c3) < WALL_TOLERANCE ? 2 : 3;
  return 2;
}

function isSame(a: Coordinates, b: Coordinates): boolean {
  return a.every((x, k) => Math.abs(x - b[k]!) < WALL_TOLERANCE);
}

function findCore(c: Coordinates, entangler: Entangler): GateOperation[] | undefined {
  const least = usesAtLeast(c, entangler);
  if (least === 0) return [];
  if (least === 1 && entangler.angle !== 'free') return [useOf(entangler)];
  const target = { kind: 'unitary', matrix: canonicalGate(c) } as const;
  for (let uses = least; uses <= USES_MAX; uses++) {
    const pairs = Array.from({ length: uses }, (): [number, number] => [0, 1]);
    const template = entanglerTemplate(2, pairs, entangler);
    const objective = new FitObjective(template, target);
    for (let k = 0; k < STARTS; k++) {
      const draw = random(1, 'pair', uses, k);
      const width = k === 0 ? 0 : k === 1 ? 0.1 : Math.PI;
      const size = angleCount(template);
      const start = Float64Array.from({ length: size }, () => width * (2 * draw() - 1));
      const run = levenbergMarquardt(objective, start, {
        goal: objective.valueOf(GOAL),
        iterationsMax: ITERATIONS_MAX,
        control: freeRunning,
      });
      let turn = run.next();
      while (!turn.done) turn = run.next();
      const { x, value } = turn.value;
      if (objective.distance(value) > DISTANCE_MAX) continue;
      return templateOperations(template, x);
    }
  }
  return undefined;
}

function useOf({ name, matrix }: Entangler): GateOperation {
  return matrix ? unitaryGate(matrix, [0, 1], name) : gate(name, [0, 1]);
}
