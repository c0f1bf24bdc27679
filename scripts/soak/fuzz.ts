import { lineKinds } from './fuzz/try-lines';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * Lines between right and wrong, read by the codec and by the firmware's core as built for this machine, which must agree. Some also go to the
 * emulated board, whose answers must be those that the codec expects and whose STEP pin must rest.
 */
soakSeeds('fuzz', lineKinds);
