import { moveKinds } from './board/seeded-moves';
import { soakSeeds } from './seeded/soak-seeds';

/** Seeded moves on the emulated board, judged by the edges of its pins, a hundred at once. */
soakSeeds('pins', moveKinds);
