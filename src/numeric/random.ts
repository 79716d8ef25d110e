/**
 * Makes repeatable random numbers from a seed.
 *
 * Method: xoshiro128++ (Blackman, Vigna, "Scrambled linear pseudorandom number generators", ACM TOMS 47,
 * 36 (2021)), seeded by SplitMix32-style mixing. Two 32-bit draws make one 53-bit double in [0, 1).
 * Normal deviates: Marsaglia's polar method (SIAM Review 6, 260 (1964)).
 * The stream depends on nothing but the seeds given, so jobs that derive their own seed give the same
 * numbers on any number of workers and in any order of completion.
 */

/** Draws the next number, uniform in [0, 1). */
export type Random = () => number;

/** A generator for the seeds given (numbers or words); `random(7, 'block', 2)` is a stream of its own. */
export function random(...seeds: readonly (number | string)[]): Random {
  let mix = deriveSeed(...seeds);
  const next = (): number => {
    mix = (mix + 0x9e3779b9) | 0;
    let z = mix;
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b);
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35);
    return z ^ (z >>> 16);
  };
  let a = next();
  let b = next();
  let c = next();
  let d = next();
  const draw = (): number => {
    const sum = (a + d) | 0;
    const result = (((sum << 7) | (sum >>> 25)) + a) >>> 0;
    const t = b << 9;
    c ^= a;
    d ^= b;
    b ^= c;
    a ^= d;
    c ^= t;
    d = (d << 11) | (d >>> 21);
    return result;
  };
  return () => {
    const high = draw() >>> 5;
    const low = draw() >>> 6;
    return (high * 67108864 + low) / 9007199254740992;
  };
}

/** A 32-bit seed from any list of numbers and words (FNV-1a over their text, then a finaliser). */
export function deriveSeed(...seeds: readonly (number | string)[]): number {
  let hash = 0x811c9dc5;
  for (const character of seeds.join('\u0000')) {
    hash = Math.imul(hash ^ (character.codePointAt(0) ?? 0), 0x01000193);
  }
  hash = Math.imul(hash ^ (hash >>> 16), 0x7feb352d);
  hash = Math.imul(hash ^ (hash >>> 15), 0x846ca68b);
  return (hash ^ (hash >>> 16)) >>> 0;
}

/** A standard normal deviate. */
export function normal(draw: Random): number {
  for (;;) {
    const x = 2 * draw() - 1;
    const y = 2 * draw() - 1;
    const s = x * x + y * y;
    if (s > 0 && s < 1) return x * Math.sqrt((-2 * Math.log(s)) / s);
  }
}
