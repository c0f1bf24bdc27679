import type { Clock } from '../interfaces/clock';
import { ProblemError } from './problem-error';

/** What was reviewed, and by whom: a token counts for nothing else. */
export interface Reviewed {
  userId: string;
  rigId: string;
  /** The act with all that was chosen. */
  subject: string;
}

export const startSubject = (choice: { protocolId: string; revision: number; massSetId: string }): string =>
  `start ${choice.protocolId} ${String(choice.revision)} ${choice.massSetId}`;
export const resumeSubject = (runId: string): string => `resume ${runId}`;
export const skipSubject = (runId: string, seq: number): string => `skip ${runId} ${String(seq)}`;

const lastsMs = 30_000;

/** The reviews whose tokens still count; in memory: after a restart everything is reviewed anew. */
export class Reviews {
  private readonly open = new Map<string, Reviewed & { untilMs: number }>();

  constructor(private readonly parts: { clock: Clock; newToken(): string }) {}

  issue(reviewed: Reviewed): { token: string; expiresUtcMs: number } {
    const { clock, newToken } = this.parts;
    const nowMs = clock.monotonicMs();
    for (const [token, { untilMs }] of this.open) if (untilMs < nowMs) this.open.delete(token);
    const token = newToken();
    this.open.set(token, { ...reviewed, untilMs: nowMs + lastsMs });
    return { token, expiresUtcMs: clock.utcMs() + lastsMs };
  }

  /**
   * Uses a token up, whatever becomes of the act.
   * @throws ProblemError where it does not count for this act
   */
  take(token: string, { userId, rigId, subject }: Reviewed): void {
    const found = this.open.get(token);
    this.open.delete(token);
    if (found === undefined || found.untilMs < this.parts.clock.monotonicMs())
      throw new ProblemError(
        'not-reviewed',
        'The review is older than 30 s or was used already. Nothing was moved. Look at it again, then confirm.',
      );
    if (found.userId !== userId || found.rigId !== rigId || found.subject !== subject)
      throw new ProblemError(
        'not-reviewed',
        'What was reviewed is not what was asked for. Nothing was moved. Review it again, then confirm.',
      );
  }

  /** The rig is not what was reviewed any more. */
  drop(rigId: string): void {
    for (const [token, reviewed] of this.open) if (reviewed.rigId === rigId) this.open.delete(token);
  }
}
