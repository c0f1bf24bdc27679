import { linkKinds } from './link/try-night';
import { soakSeeds } from './seeded/soak-seeds';

/** Nights with trouble of every other kind than those of `r2`: on the line in one direction, several at once, and at the machine; from seeds. */
soakSeeds('link', linkKinds);
