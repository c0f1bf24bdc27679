import type { MountedRoute } from '../route-context';
import { armingRoutes } from './arming';
import { dataRoutes } from './data';
import { deviceRoutes } from './devices';
import { doorRoutes } from './doors';
import { evaluationRoutes } from './evaluations';
import { lineRoutes } from './line';
import { liveRoutes } from './live';
import { peopleRoutes } from './people';
import { protocolRoutes } from './protocols';
import { rigRoutes } from './rigs';
import { runRoutes } from './runs';
import { scheduleRoutes } from './schedules';
import { serviceRoutes } from './service';

/** Every route of the API with the function that answers it. */
export const allRoutes: readonly MountedRoute[] = [
  ...serviceRoutes,
  ...peopleRoutes,
  ...rigRoutes,
  ...armingRoutes,
  ...lineRoutes,
  ...protocolRoutes,
  ...runRoutes,
  ...liveRoutes,
  ...scheduleRoutes,
  ...doorRoutes,
  ...dataRoutes,
  ...deviceRoutes,
  ...evaluationRoutes,
];
