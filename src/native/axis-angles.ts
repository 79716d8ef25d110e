/**
 * Takes a single-wire gate apart in rotations about any two axes.
 *
 * Shape: u is 2 x 2, planar, unitary; u = e^{ia} Rp(b) Rq(t) Rp(c) for the outer axis p and the inner axis q.
 * Method: a turn of the frame that carries (q, p) to (y, z) leaves the numbers of the quaternion in another order, one with a
 * sign; there the angles are those of `euler.ts`.
 */
import { eulerAngles, fromQuaternion, quaternion } from './euler.ts';

export type Axis = 'x' | 'y' | 'z';

/** [c, t, b], in order of time. */
export function axisAngles(u: Float64Array, outer: Axis, inner: Axis): [number, number, number] {
  const [q0, x, y, z] = quaternion(u);
  const parts = { x, y, z };
  const third = (['x', 'y', 'z'] as const).find((axis) => axis !== outer && axis !== inner)!; // two axes of three are taken
  // (third, inner, outer) is right-handed or its third part changes sign
  const isRight = ['xyz', 'yzx', 'zxy'].includes(third + inner + outer);
  const a = isRight ? parts[third] : -parts[third];
  const [b, c] = [parts[inner], parts[outer]];
  const { t, f, l } = eulerAngles(fromQuaternion(q0, a, b, c));
  return [l, t, f];
}

/** exp(-i angle P / 2). */
export function rotationMatrix(axis: Axis, angle: number): Float64Array {
  const [c, s] = [Math.cos(angle / 2), Math.sin(angle / 2)];
  switch (axis) {
    case 'x':
      return Float64Array.from([c, 0, 0, c, 0, -s, -s, 0]);
    case 'y':
      return Float64Array.from([c, -s, s, c, 0, 0, 0, 0]);
    case 'z':
      return Float64Array.from([c, 0, 0, c, -s, 0, 0, s]);
  }
}
