/**
 * The SHA-256 hash of a text in UTF-8, as 64 hexadecimal digits.
 *
 * Method: FIPS 180-4, sections 4.1.2, 4.2.2, 5.1.1 and 6.2; the constants are the first 32 bits of the fractional parts of the
 * cube roots of the first 64 primes, and of the square roots of the first 8, computed here in exact integers.
 * Plain TypeScript, because the core knows no platform.
 */
const PRIMES = firstPrimes(64);
const K = Uint32Array.from(PRIMES, (p) => fractionOfRoot(BigInt(p), 3n));
const START = Uint32Array.from(PRIMES.slice(0, 8), (p) => fractionOfRoot(BigInt(p), 2n));

function firstPrimes(count: number): number[] {
  const found: number[] = [];
  for (let n = 2; found.length < count; n++) if (found.every((p) => n % p !== 0)) found.push(n);
  return found;
}

/** floor(2^32 frac(n^(1/degree))): the integer root of n 2^(32 degree), by bisection, modulo 2^32. */
function fractionOfRoot(n: bigint, degree: bigint): number {
  const wanted = n << (32n * degree);
  let [low, high] = [0n, 1n << 40n];
  while (high - low > 1n) {
    const middle = (low + high) >> 1n;
    if (middle ** degree <= wanted) low = middle;
    else high = middle;
  }
  return Number(low & 0xffffffffn);
}

function utf8(text: string): number[] {
  const bytes: number[] = [];
  for (const character of text) {
    const code = character.codePointAt(0) ?? 0;
    if (code < 0x80) bytes.push(code);
    else if (code < 0x800) bytes.push(0xc0 | (code >> 6), 0x80 | (code & 63));
    else if (code < 0x10000) bytes.push(0xe0 | (code >> 12), 0x80 | ((code >> 6) & 63), 0x80 | (code & 63)); // biome-ignore format: three bytes
    else bytes.push(0xf0 | (code >> 18), 0x80 | ((code >> 12) & 63), 0x80 | ((code >> 6) & 63), 0x80 | (code & 63)); // biome-ignore format: four bytes
  }
  return bytes;
}

const turned = (x: number, n: number): number => (x >>> n) | (x << (32 - n));

export function sha256(text: string): string {
  const bytes = utf8(text);
  const length = bytes.length;
  bytes.push(0x80);
  while (bytes.length % 64 !== 56) bytes.push(0);
  for (let shift = 7; shift >= 0; shift--)
    bytes.push(Math.floor((length * 8) / 2 ** (8 * shift)) & 255);
  const state = START.slice();
  const w = new Uint32Array(64);
  for (let block = 0; block < bytes.length; block += 64) {
    for (let t = 0; t < 16; t++) {
      const at = block + 4 * t;
      w[t] = (bytes[at]! << 24) | (bytes[at + 1]! << 16) | (bytes[at + 2]! << 8) | bytes[at + 3]!;
    }
    for (let t = 16; t < 64; t++) {
      const [x, y] = [w[t - 15]!, w[t - 2]!];
      const s0 = turned(x, 7) ^ turned(x, 18) ^ (x >>> 3);
      const s1 = turned(y, 17) ^ turned(y, 19) ^ (y >>> 10);
      w[t] = w[t - 16]! + s0 + w[t - 7]! + s1;
    }
    compress(state, w);
  }
  return [...state].map((word) => word.toString(16).padStart(8, '0')).join('');
}

function compress(state: Uint32Array, w: Uint32Array): void {
  let [a, b, c, d, e, f, g, h] = state as unknown as [
    number, number, number, number, number, number, number, number,
  ]; // biome-ignore format: the eight words of the state
  for (let t = 0; t < 64; t++) {
    const big1 = turned(e, 6) ^ turned(e, 11) ^ turned(e, 25);
    const one = (h + big1 + ((e & f) ^ (~e & g)) + K[t]! + w[t]!) >>> 0;
    const big0 = turned(a, 2) ^ turned(a, 13) ^ turned(a, 22);
    const two = (big0 + ((a & b) ^ (a & c) ^ (b & c))) >>> 0;
    [h, g, f, e, d, c, b, a] = [g, f, e, (d + one) >>> 0, c, b, a, (one + two) >>> 0];
  }
  [a, b, c, d, e, f, g, h].forEach((word, k) => {
    state[k] = state[k]! + word;
  });
}
