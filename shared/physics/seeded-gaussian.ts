import type { JumpableRandomGenerator } from 'pure-rand/types/JumpableRandomGenerator';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

const HALF_RANGE = 2 ** -31;

/** Independent streams of one seed: each starts 2⁶⁴ numbers after the one before it. */
export function seededStreams(seed: number, count: number): GaussianSource[] {
  const generator = xoroshiro128plus(seed);
  return Array.from({ length: count }, () => {
    const own = generator.clone();
    generator.jump();
    return new GaussianSource(own);
  });
}

/** Standard normal numbers by Marsaglia's polar method (1964, from memory), from a seeded generator. */
export class GaussianSource {
  private spare: number | null = null;

  constructor(private readonly generator: JumpableRandomGenerator) {}

  next(): number {
    if (this.spare !== null) {
      const spare = this.spare;
      this.spare = null;
      return spare;
    }
    for (;;) {
      const x = this.generator.next() * HALF_RANGE;
      const y = this.generator.next() * HALF_RANGE;
      const square = x * x + y * y;
      if (square >= 1 || square === 0) continue;
      const scale = Math.sqrt((-2 * Math.log(square)) / square);
      this.spare = y * scale;
      return x * scale;
    }
  }

  /** Waiting time of a Poisson process, in units of its mean. */
  wait(): number {
    return -Math.log((this.generator.next() + 2 ** 31 + 1) * 2 ** -32);
  }

  /** Uniform in (−1, 1). */
  uniform(): number {
    return this.generator.next() * HALF_RANGE;
  }
}
