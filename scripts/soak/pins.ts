import { runSeededMoves } from './board/seeded-moves';
import { soak } from './report';

/** Seeded moves on the emulated board, judged by the edges of its pins: 1,000, or 20,000 as the second figure. */
const FIRST = 1_000;
const SECOND = 20_000;
const SEED = 21;

soak('pins', (args) => {
  const moves = args.includes('--second') ? SECOND : FIRST;
  const { wrong, disturbed, steps, boardS } = runSeededMoves(moves, SEED);
  return { ok: wrong.length === 0, moves, disturbed, steps, boardS: Math.round(boardS), seed: SEED, violations: wrong };
});
