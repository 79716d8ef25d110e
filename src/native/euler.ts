/**
 * Writes a single-wire gate in rotations and fixed gates of a chosen set, with as few pieces as possible.
 *
 * Shape: u is 2 x 2, planar, unitary up to rounding; the result is in order of time and equal to u up to a phase.
 * Method: u = e^{ia} Rz(f) Ry(t) Rz(l), t in [0, pi] (Nielsen, Chuang, theorem 4.1); from it
 *   rz, sx      Rz(f + pi) SX Rz(t + pi) SX Rz(l); one SX where t = pi/2, none where t = 0; SX SX (or X) where t = pi
 *   u3          u3(t, f, l)
 *   rx, rz      Rz(f + pi/2) Rx(t) Rz(l - pi/2); ry, rz and rx, ry likewise
 *   prx, rz     Rz(f + l) times one rotation by t about the axis at azimuth pi/2 - l
 * (SX = Rx(pi/2) up to phase; conjugation of Rx(t) by Rz turns its axis.)
 * Angles are in (-pi, pi]; rotations by less than `ANGLE_TOLERANCE` are left out.
 */
export const ONE_WIRE_SETS = [
  'rz,sx',
  'rz,sx,x',
  'u3',
  'rx,rz',
  'ry,rz',
  'rx,ry',
  'prx,rz',
] as const;
export type OneWireSet = (typeof ONE_WIRE_SETS)[number];

export type OneWireGate = { name: string; angles: number[] };

/** An angle this near to a special value counts as it: D changes by its square, 1e-25. */
export const ANGLE_TOLERANCE = 4e-13;

/** The angles of u = e^{i phase} Rz(f) Ry(t) Rz(l), t in [0, pi]. */
export function eulerAngles(u: Float64Array): { t: number; f: number; l: number; phase: number } {
  const [ar, br, cr, dr, ai, bi, ci, di] = u as unknown as [
    number, number, number, number, number, number, number, number,
  ]; // biome-ignore format: the eight numbers of a 2 x 2 matrix
  const t = 2 * Math.atan2(Math.hypot(cr, ci, br, bi), Math.hypot(ar, ai, dr, di));
  // f from the two left entries; then f + l or f - l from the larger pair, so that rounding of small entries
  // stays in the difference that does not matter
  const isUpper = t <= Math.PI / 2;
  const hasBoth = Math.min(Math.hypot(ar, ai), Math.hypot(cr, ci)) > 1e-15;
  const sum = phaseBetween(dr, di, ar, ai);
  const difference = phaseBetween(cr, ci, -br, -bi);
  const f = hasBoth ? phaseBetween(cr, ci, ar, ai) : isUpper ? sum : difference;
  const l = hasBoth ? (isUpper ? sum - f : f - difference) : 0;
  // u = e^{i phase} Rz(f) Ry(t) Rz(l): its (0, 0) entry has phase - (f + l)/2, its (1, 0) entry phase + (f - l)/2
  const phase = isUpper ? Math.atan2(ai, ar) + (f + l) / 2 : Math.atan2(ci, cr) - (f - l) / 2;
  return { t, f, l, phase };
}

/** The phase of (a + ib) / (c + id). */
function phaseBetween(a: number, b: number, c: number, d: number): number {
  return Math.atan2(b * c - a * d, a * c + b * d);
}

/** The angle in (-pi, pi]. */
export function wrapped(angle: number): number {
  const turned = angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
  return turned <= -Math.PI ? turned + 2 * Math.PI : turned;
}

function isZero(angle: number): boolean {
  return Math.abs(wrapped(angle)) < ANGLE_TOLERANCE;
}

function rotation(name: string, angle: number): OneWireGate[] {
  return isZero(angle) ? [] : [{ name, angles: [wrapped(angle)] }];
}

const bare = (name: string): OneWireGate => ({ name, angles: [] });

/** The gate in the given set, first gate first; empty for the identity. */
export function oneWireGates(u: Float64Array, set: OneWireSet): OneWireGate[] {
  const { t, f, l } = eulerAngles(u);
  const isDiagonal = t < ANGLE_TOLERANCE;
  switch (set) {
    case 'rz,sx':
    case 'rz,sx,x':
      return withSx(t, f, l, set === 'rz,sx,x');
    case 'u3':
      if (isDiagonal && isZero(f + l)) return [];
      return [
        { name: 'u3', angles: isDiagonal ? [0, 0, wrapped(f + l)] : [t, wrapped(f), wrapped(l)] },
      ];
    case 'ry,rz':
      return conjugated('rz', 'ry', f, t, l);
    case 'rx,rz':
      return conjugated('rz', 'rx', f + Math.PI / 2, t, l - Math.PI / 2);
    case 'rx,ry':
      return aboutXY(u);
    case 'prx,rz':
      if (isDiagonal) return rotation('rz', f + l);
      return [{ name: 'prx', angles: [t, wrapped(Math.PI / 2 - l)] }, ...rotation('rz', f + l)];
  }
}

function withSx(t: number, f: number, l: number, hasX: boolean): OneWireGate[] {
  if (t < ANGLE_TOLERANCE) return rotation('rz', f + l);
  if (Math.abs(t - Math.PI / 2) < ANGLE_TOLERANCE) {
    return [...rotation('rz', l - Math.PI / 2), bare('sx'), ...rotation('rz', f + Math.PI / 2)];
  }
  if (Math.abs(t - Math.PI) < ANGLE_TOLERANCE) {
    // Rz(f + pi) X Rz(l) = X Rz(l - f - pi)
    const flip = hasX ? [bare('x')] : [bare('sx'), bare('sx')];
    return [...rotation('rz', l - f - Math.PI), ...flip];
  }
  return [
    ...rotation('rz', l),
    bare('sx'),
    { name: 'rz', angles: [wrapped(t + Math.PI)] },
    bare('sx'),
    ...rotation('rz', f + Math.PI),
  ];
}

/** outer(a) inner(t) outer(b), b first; merged where the inner angle is 0 or pi. */
function conjugated(outer: string, inner: string, a: number, t: number, b: number): OneWireGate[] {
  if (t < ANGLE_TOLERANCE) return rotation(outer, a + b);
  // inner(pi) outer(b) = outer(-b) inner(pi)
  if (Math.abs(t - Math.PI) < ANGLE_TOLERANCE) {
    return [...rotation(outer, b - a), { name: inner, angles: [Math.PI] }];
  }
  return [...rotation(outer, b), { name: inner, angles: [t] }, ...rotation(outer, a)];
}

/** Rx(a) Ry(t) Rx(b): the zyz angles of C^dag u C for the turn C about y that carries z to x and x to -z. */
function aboutXY(u: Float64Array): OneWireGate[] {
  const [q0, qx, qy, qz] = quaternion(u);
  const { t, f, l } = eulerAngles(fromQuaternion(q0, -qz, qy, qx));
  return conjugated('rx', 'ry', f, t, l);
}

/** u = e^{ia} (q0 - i (qx X + qy Y + qz Z)). */
export function quaternion(u: Float64Array): [number, number, number, number] {
  const { t, f, l } = eulerAngles(u);
  const [c, s] = [Math.cos(t / 2), Math.sin(t / 2)];
  const [sum, difference] = [(f + l) / 2, (f - l) / 2];
  return [
    c * Math.cos(sum),
    -s * Math.sin(difference),
    s * Math.cos(difference),
    c * Math.sin(sum),
  ];
}

/** The matrix q0 - i (x X + y Y + z Z). */
export function fromQuaternion(q0: number, x: number, y: number, z: number): Float64Array {
  return new Float64Array([q0, -y, y, q0, -z, -x, -x, z]);
}
