import { BoardBench } from '@/scripts/soak/board/board-bench';
import { judge, type Motion } from '@/scripts/soak/board/pin-oracle';
import { runSeededMoves } from '@/scripts/soak/board/seeded-moves';

/** Seeded moves on the emulated board, judged by what its pins did. `EVENFALL_PIN_MOVES` makes more of them. */

const moves = Number(process.env['EVENFALL_PIN_MOVES'] ?? 100);
jest.setTimeout(60_000 + moves * 1000);

test(`${moves} seeded moves: exact on the step, never faster or steeper than asked, in clean pulses`, () => {
  const { wrong, disturbed } = runSeededMoves(moves, 20);
  expect(wrong).toEqual([]);
  expect(disturbed).toBeGreaterThan(moves / 20);
});

/** Faults are planted in the record of real moves: in the edges of the pins, or in what the controller said of them. */
describe('the judge of the pins finds', () => {
  let fast: Motion;
  let slow: Motion;
  let far: Motion;

  beforeAll(() => {
    const bench = new BoardBench();
    bench.home();
    fast = bench.move({ to: 1500, speed: 2000, acceleration: 4000 });
    slow = bench.move({ to: 1520, speed: 25, acceleration: 2000 });
    far = bench.move({ to: -34_000, speed: 8000, acceleration: 8000 });
  });

  /** The same edges at other times; time runs from the first step, in cycles. */
  const retimed = (motion: Motion, timeOf: (cycles: number, share: number) => number): Motion => {
    const first = motion.edges.find(({ pin, level }) => pin === 'step' && level)?.cycle ?? 0;
    const last = motion.edges.at(-1)?.cycle ?? 0;
    // Pulses keep their width: only rising edges are moved, falling ones follow.
    let shift = 0;
    const edges = motion.edges.map((edge) => {
      if (edge.pin !== 'step') return edge;
      if (edge.level) shift = Math.round(first + timeOf(edge.cycle - first, (edge.cycle - first) / (last - first))) - edge.cycle;
      return { ...edge, cycle: edge.cycle + shift };
    });
    return { ...motion, edges };
  };
  const without = (motion: Motion, number: number): Motion => {
    const at = motion.edges.findIndex(({ pin, level }) => pin === 'step' && level) + 2 * number;
    return { ...motion, edges: motion.edges.filter((_, index) => index !== at && index !== at + 1) };
  };
  const second = 16_000_000;
  const rampS = 0.5;

  test('nothing in the moves as they were, of more than 32767 steps too', () => {
    expect([judge(fast), judge(slow), judge(far)]).toEqual([[], [], []]);
    expect(Math.abs(far.reportedEnd - far.from)).toBeGreaterThan(32_767);
  });

  const planted: [string, () => Motion, string][] = [
    ['3 % too fast', () => retimed(fast, (cycles) => cycles / 1.03), 'faster than'],
    [
      'one step too many',
      () => ({ ...fast, edges: [...fast.edges, ...fast.edges.slice(-2).map((edge) => ({ ...edge, cycle: edge.cycle + second }))] }),
      'the pins made 1501 steps',
    ],
    ['a step missing at the pin, the count right', () => without(fast, 700), 'the pins made 1499 steps'],
    [
      'braking that begins late and is too steep',
      () => {
        const endS = 1500 / 2000 + rampS;
        return retimed(fast, (cycles) => {
          // The way of the ramp down at the same speed for longer, then in half the time.
          const lateS = cycles / second - (endS - rampS);
          if (lateS <= 0) return cycles;
          const way = 2000 * lateS - 2000 * lateS * lateS;
          const cruised = 250;
          const timeS =
            way <= cruised ? way / 2000 : cruised / 2000 + (2000 - Math.sqrt(Math.max(0, 2000 ** 2 - 2 * 8000 * (way - cruised)))) / 8000;
          return (endS - rampS + timeS) * second;
        });
      },
      'brakes with',
    ],
    ['twice the acceleration', () => retimed({ ...fast, speed: 4000 }, (cycles) => cycles / Math.SQRT2), 'accelerates with'],
    ['DIR not set', () => ({ ...fast, directionBefore: false, edges: fast.edges.filter(({ pin }) => pin !== 'direction') }), 'steps from'],
    [
      'DIR set with the first step',
      () => ({
        ...fast,
        directionBefore: false,
        edges: [{ pin: 'direction', level: true, cycle: (fast.edges.find(({ pin }) => pin === 'step')?.cycle ?? 0) - 16 }, ...fast.edges],
      }),
      'DIR changed',
    ],
    [
      'a turn of the timer lost in a long wait',
      () => retimed(slow, (cycles, share) => (share > 0.5 ? cycles - 65_536 * 8 : cycles)),
      'faster than',
    ],
    [
      'a dead stop',
      () => ({ ...fast, target: null, reportedEnd: 750, placeEnd: 750, edges: fast.edges.slice(0, fast.edges.length - 2 * 750) }),
      'a dead stop',
    ],
    [
      'a position of 16 bits',
      () => ({ ...far, reportedEnd: ((far.reportedEnd + 32_768) & 0xffff) - 32_768, target: null }),
      'the controller says',
    ],
    [
      'a pulse that is too short',
      () => ({
        ...fast,
        edges: fast.edges.map((edge, index) =>
          edge.pin === 'step' && !edge.level ? { ...edge, cycle: (fast.edges[index - 1]?.cycle ?? 0) + 16 } : edge,
        ),
      }),
      'a pulse of 1 µs',
    ],
  ];

  test.each(planted)('%s', (_, faulty, words) => {
    expect(judge(faulty()).join('\n')).toContain(words);
  });
});
