import { heartbeatKinds } from './heartbeat/try-loss';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * The sign of life of a server ends in a swing, in four ways, at instants from seeds; and more than 24 h of swings under a server that is late with
 * everything, where nothing may trip.
 */
soakSeeds('r6', heartbeatKinds);
