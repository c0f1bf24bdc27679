import type { MountedRoute } from '../route-context';
import { alarmRoutes } from './alarms';
import { armingRoutes } from './arming';
import { auditRoutes } from './audit';
import { brokerRoutes } from './brokers';
import { calibrationRoutes } from './calibrations';
import { callRoutes } from './calls';
import { cameraRoutes } from './cameras';
import { dataRoutes } from './data';
import { deviceRoutes } from './devices';
import { doorRoutes } from './doors';
import { evaluationRoutes } from './evaluations';
import { exclusionRoutes } from './exclusions';
import { importFileRoutes } from './import-files';
import { interventionRoutes } from './interventions';
import { lineRoutes } from './line';
import { liveRoutes } from './live';
import { peopleRoutes } from './people';
import { protocolRoutes } from './protocols';
import { retentionRoutes } from './retention';
import { rigRoutes } from './rigs';
import { runRoutes } from './runs';
import { sampleExportRoutes } from './sample-export';
import { scheduleRoutes } from './schedules';
import { serviceRoutes } from './service';
import { stepNoteRoutes } from './step-notes';
import { workRoutes } from './work';

/** Every route of the API with the function that answers it. */
export const allRoutes: readonly MountedRoute[] = [
  ...serviceRoutes,
  ...peopleRoutes,
  ...auditRoutes,
  ...rigRoutes,
  ...armingRoutes,
  ...lineRoutes,
  ...protocolRoutes,
  ...runRoutes,
  ...interventionRoutes,
  ...liveRoutes,
  ...scheduleRoutes,
  ...doorRoutes,
  ...importFileRoutes,
  ...dataRoutes,
  ...calibrationRoutes,
  ...sampleExportRoutes,
  ...retentionRoutes,
  ...deviceRoutes,
  ...brokerRoutes,
  ...cameraRoutes,
  ...exclusionRoutes,
  ...stepNoteRoutes,
  ...evaluationRoutes,
  ...workRoutes,
  ...alarmRoutes,
  ...callRoutes,
];
