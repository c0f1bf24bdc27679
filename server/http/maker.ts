import type { Maker } from '../store/rigs';
import type { SignedIn } from './route-context';
import type { Services } from './services';

/** Who did it and when, for the records. */
export const makerOf = (context: { me: SignedIn; services: Services }): Maker => ({
  userId: context.me.userId,
  name: context.me.name,
  at: context.services.clock.utcMs(),
});

/** ISO 8601 UTC with milliseconds. */
export const isoOf = (utcMs: number): string => new Date(utcMs).toISOString();
export const isoOrNull = (utcMs: number | null): string | null => (utcMs === null ? null : isoOf(utcMs));
