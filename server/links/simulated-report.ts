import { CAPABILITY, FLAG, hex8, type HiBody, type MachineState, type OkBody } from '@/firmware-protocol/codec';
import type { MachineSetting } from './machine-setting';

/** What an `ok` reply tells of the controller. */
export interface MachineFacts {
  state: MachineState;
  position: number | null;
  positionKnown: boolean;
  interlockClosed: boolean;
  supplyPresent: boolean;
  armKey: boolean;
  driversOn: boolean;
  homeFlag: boolean;
  leaseLive: boolean;
  motionEnded: boolean;
  warningDue: boolean;
  event: number;
  dropped: number;
}

const RESOLUTION_US = 4;
const EVERYTHING = Object.values(CAPABILITY).reduce((sum, bit) => sum | bit, 0);
const FLAGS = Object.entries(FLAG) as [keyof typeof FLAG, number][];

/** SPEC 5.2 and 5.4. */
export function okBody(facts: MachineFacts): OkBody {
  let flags = 0;
  for (const [name, bit] of FLAGS) if (facts[name]) flags |= bit;
  return { word: 'ok', state: facts.state, position: facts.position, flags, event: facts.event, dropped: facts.dropped };
}

/** SPEC 5.5. */
export function hiBody({ version, firmware }: MachineSetting, bootCount: number, session: string): HiBody {
  return { word: 'hi', ...version, boot: hex8(bootCount), session, resolutionUs: RESOLUTION_US, capabilities: EVERYTHING, firmware };
}
