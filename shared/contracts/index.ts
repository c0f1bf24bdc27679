import * as alarms from './alarms';
import * as audit from './audit';
import * as brokers from './brokers';
import * as calibrations from './calibrations';
import * as calls from './calls';
import * as cameras from './cameras';
import * as data from './data';
import * as devices from './devices';
import * as doors from './doors';
import * as evaluations from './evaluations';
import * as exclusions from './exclusions';
import * as goingOn from './going-on';
import * as importFiles from './import-files';
import * as link from './link';
import * as morning from './morning';
import * as people from './people';
import * as protocols from './protocols';
import * as retention from './retention';
import * as reviews from './reviews';
import * as rigs from './rigs';
import type { RouteContract } from './route';
import * as runs from './runs';
import * as schedules from './schedules';
import * as service from './service';
import * as standing from './standing';
import * as stepNotes from './step-notes';
import * as work from './work';

const isRoute = (value: unknown): value is RouteContract =>
  typeof value === 'object' && value !== null && 'method' in value && 'path' in value && 'access' in value;

/** Every route of the API, once. */
export const routes: readonly RouteContract[] = [
  service,
  people,
  audit,
  rigs,
  standing,
  link,
  reviews,
  protocols,
  runs,
  goingOn,
  morning,
  schedules,
  doors,
  data,
  importFiles,
  calibrations,
  retention,
  devices,
  brokers,
  cameras,
  exclusions,
  stepNotes,
  evaluations,
  work,
  alarms,
  calls,
].flatMap((module) => Object.values(module).filter(isRoute));
