import { clockKinds } from './clock/clock-kinds';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * Time: rules of schedules, each through a year in one of eight zones, beside an independent calendar; and short runs while the wall clock of the
 * server is set by 1 s or 1 h and gains or loses up to 200 ppm, from seeds.
 */
soakSeeds('r9', clockKinds);
