import type { StartCheck } from '@/shared/contracts/rigs';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import type { RigRecord } from '../store/rigs';

export interface StartPlan {
  rig: RigRecord;
  /** The rig document with the mass set that will be on the turntable. */
  document: RigDocument;
  protocol: ProtocolDocument;
  timeZone: string;
  /** Who would start. */
  userId: string;
}

export type Figures = StartCheck['figures'];
export type Outcome = Omit<StartCheck, 'code' | 'title'>;

export const check = (code: string, title: string, outcome: Outcome): StartCheck => ({ code, title, ...outcome });
export const pass = (detail: string, ...figures: Figures): Outcome => ({ state: 'pass', detail, figures });
export const note = (detail: string, ...figures: Figures): Outcome => ({ state: 'note', detail, figures });
export const fail = (detail: string, ...figures: Figures): Outcome => ({ state: 'fail', detail, figures });

export const unanswered = 'Not known: the controller has not answered.';
