import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { SeededKinds } from '../seeded/try-seeds';
import { BoardBench } from './board-bench';
import { judge } from './pin-oracle';

export interface MovesMade {
  /** What was wrong, in words. */
  wrong: string[];
  /** Moves that were disturbed on their way: held, or asked something. */
  disturbed: number;
  steps: number;
  boardS: number;
}

/** Moves of all speeds, ramps and lengths on the emulated board, judged by what its pins did. */
export function runSeededMoves(moves: number, seed: number): MovesMade {
  const bench = new BoardBench();
  bench.home();
  const random = xoroshiro128plus(seed);
  const upTo = (least: number, most: number) => uniformInt(random, least, most);
  const spread = (least: number, most: number) => Math.round(least * (most / least) ** (upTo(0, 1_000_000) / 1_000_000));
  const made: MovesMade = { wrong: [], disturbed: 0, steps: 0, boardS: 0 };
  for (let number = 0; number < moves; number += 1) {
    const from = bench.session.board.table.track.at(Infinity);
    const speed = spread(50, 8000);
    const acceleration = spread(200, 8000);
    const way = Math.min(800, spread(1, Math.max(2, speed))) * (from > 0 ? -1 : 1);
    const act = () => {
      made.disturbed += 1;
      bench.ask(number % 2 === 0 ? { word: 'hold' } : { word: 'status' });
    };
    const motion = bench.move({ to: from + way, speed, acceleration }, number % 5 === 4 ? { afterMs: upTo(1, 400), act } : undefined);
    made.steps += motion.edges.filter(({ pin, level }) => pin === 'step' && level).length;
    made.wrong.push(...judge(motion).map((words) => `seed ${seed}, move ${number} by ${way} at ${speed}/s, ${acceleration}/s²: ${words}`));
  }
  return { ...made, boardS: bench.ms / 1000 };
}

const AT_ONCE = 100;

/** A hundred moves at once: 1,000, or 20,000 as the second figure. */
export const moveKinds: SeededKinds = {
  moves: { attempt: (seed) => runSeededMoves(AT_ONCE, seed).wrong, first: 10, second: 200 },
};
