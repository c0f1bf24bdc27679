import { serialKinds } from './link/try-night';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * The nine faults of a serial line, each by itself, from seeds: a line is lost, comes twice, in another order, cut short, with a flipped bit, late or among
 * noise, nothing passes for a while, or the controller refuses. Nothing is carried out twice, called done without an answer, or read where it was spoilt.
 */
soakSeeds('r2', serialKinds);
