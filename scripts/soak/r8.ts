import { phoneKinds } from './phone/try-phone';
import { soakSeeds } from './seeded/soak-seeds';

/** A phone on a bad network, eight ways, from seeds: a resume and a stop are tapped. */
soakSeeds('r8', phoneKinds);
