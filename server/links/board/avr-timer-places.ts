/** Where a timer's registers and vectors lie (data sheet DS40002061, sections 12.4, 15 to 18); vectors in words. */
export interface TimerPlace {
  bits: 8 | 16;
  controlA: number;
  controlB: number;
  /** Force output compare: register and bit of unit A (unit B is the next lower bit). */
  force: number;
  count: number;
  compareA: number;
  compareB: number;
  /** Top register of one more mode, 16 bits only. */
  capture?: number;
  flags: number;
  mask: number;
  vectors: { a: number; b: number; overflow: number };
  /** Divisor for each value of the clock select bits; 0 stopped. */
  divisors: readonly number[];
}

const SYNCHRONOUS = [0, 1, 8, 64, 256, 1024] as const;

export const TIMERS: readonly [TimerPlace, TimerPlace, TimerPlace] = [
  {
    bits: 8,
    controlA: 0x44,
    controlB: 0x45,
    force: 0x45,
    count: 0x46,
    compareA: 0x47,
    compareB: 0x48,
    flags: 0x35,
    mask: 0x6e,
    vectors: { a: 0x1c, b: 0x1e, overflow: 0x20 },
    divisors: SYNCHRONOUS,
  },
  {
    bits: 16,
    controlA: 0x80,
    controlB: 0x81,
    force: 0x82,
    count: 0x84,
    compareA: 0x88,
    compareB: 0x8a,
    capture: 0x86,
    flags: 0x36,
    mask: 0x6f,
    vectors: { a: 0x16, b: 0x18, overflow: 0x1a },
    divisors: SYNCHRONOUS,
  },
  {
    bits: 8,
    controlA: 0xb0,
    controlB: 0xb1,
    force: 0xb1,
    count: 0xb2,
    compareA: 0xb3,
    compareB: 0xb4,
    flags: 0x37,
    mask: 0x70,
    vectors: { a: 0x0e, b: 0x10, overflow: 0x12 },
    divisors: [0, 1, 8, 32, 64, 128, 256, 1024],
  },
];
