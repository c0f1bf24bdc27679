import { linkKinds } from './link/try-night';
import { soakSeeds } from './seeded/soak-seeds';

/** Nights with every kind of trouble on the line and at the machine, from seeds. */
soakSeeds('link', linkKinds);
