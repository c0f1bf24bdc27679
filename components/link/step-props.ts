import type { LineMessage } from '@/shared/contracts/link';
import type { RigView } from '@/shared/contracts/rigs';
import type { RigMotion } from '@/shared/rig/document';
import type { FirstMove } from './first-move-draft';
import type { GuidedMove } from './use-guided';

/** What every step of the first move is given. */
export interface StepProps {
  rig: RigView;
  etag: string | undefined;
  motion: RigMotion;
  line: LineMessage;
  guided: GuidedMove;
  move: FirstMove;
}
