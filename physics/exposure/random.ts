/**
 * Seeded random numbers for pseudo-experiments: xoshiro128** (D. Blackman & S. Vigna, ACM Trans. Math. Softw. 47, 36 (2021)), all in
 * 32-bit arithmetic, so that a seed gives the same numbers on every machine. Not for secrets.
 */
import { DomainError } from '../errors.ts';

/** Uniform on [0, 1), a multiple of 2⁻⁵³. */
export type Random = () => number;

/** The 32-bit finaliser of MurmurHash3 (A. Appleby, 2011), which spreads a seed over the state. */
function mixed(word: number): number {
  let h = word | 0;
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return (h ^ (h >>> 16)) | 0;
}

function rotated(word: number, by: number): number {
  return (word << by) | (word >>> (32 - by));
}

/**
 * @param seed an integer from 0 to 2⁵³ − 1. @throws DomainError otherwise.
 * @example const random = seededRandom(1); random();
 */
export function seededRandom(seed: number): Random {
  if (!(Number.isSafeInteger(seed) && seed >= 0)) throw new DomainError('seed', seed, 'an integer from 0 to 2^53 - 1');
  const low = seed % 2 ** 32;
  const high = Math.floor(seed / 2 ** 32);
  const golden = 0x9e3779b9;
  let [a, b, c, d] = [1, 2, 3, 4].map((k) => mixed(mixed(low + k * golden) ^ (high + k)));
  // The one forbidden state.
  if ((a | b | c | d) === 0) a = 1;

  const next32 = (): number => {
    const result = Math.imul(rotated(Math.imul(b, 5), 7), 9) >>> 0;
    const shifted = b << 9;
    c ^= a;
    d ^= b;
    b ^= c;
    a ^= d;
    c ^= shifted;
    d = rotated(d, 11);
    return result;
  };
  return () => ((next32() >>> 5) * 2 ** 26 + (next32() >>> 6)) / 2 ** 53;
}
