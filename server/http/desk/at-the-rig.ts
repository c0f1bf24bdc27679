import type { MountedRoute, RouteContext } from '../route-context';
import { rigOfRun } from '@/server/store/runs-read';
import type { WhichRig } from './rig-desk';

type Finder = (context: RouteContext) => Promise<WhichRig>;

interface How {
  /** Heard late or twice they do no harm: hold, stop, whatever only reads. */
  urgent?: true;
  /** Where no process drives the rig, what the database knows is better than nothing. */
  elseStored?: true;
}

/** Routes that only the process can answer that drives the rig. */
export const atTheRig = (which: Finder | 'each', routes: readonly MountedRoute[], how: How = {}): MountedRoute[] =>
  routes.map((route) => ({
    ...route,
    atTheRig: { which, urgent: how.urgent === true, elseStored: how.elseStored === true },
  }));

const paramOf = ({ params }: RouteContext, name: string) => (params as Record<string, string>)[name] ?? '';
const labOf = ({ membership }: RouteContext) => (membership as { labId: string } | null)?.labId ?? '';

/** The rig of the address. */
export const rigOfAddress: Finder = (context) => Promise.resolve({ labId: labOf(context), rigId: paramOf(context, 'rigId') });

/** The rig of the run of the address while the run goes on; one that is over needs nobody. */
export const rigOfItsRun: Finder = (context) =>
  rigOfRun(context.services.database.db, { labId: labOf(context), runId: paramOf(context, 'runId') });

/** The rig of the body. */
export const rigOfBody: Finder = (context) =>
  Promise.resolve({ labId: labOf(context), rigId: (context.body as unknown as { rigId: string }).rigId });

/** Any process that drives rigs. */
export const anyRig: Finder = () => Promise.resolve('any');
