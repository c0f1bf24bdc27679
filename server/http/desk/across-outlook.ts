import type { RunView } from '@/shared/contracts/runs';
import type { LineMessage } from '@/shared/contracts/link';
import type { Clock } from '@/server/interfaces/clock';
import type { ProcessMessage, ProcessPost, RigPlace, RigTold } from '@/server/interfaces/process-post';
import { ProblemError } from '../problem-error';
import { Repeated } from './repeated';
import { longestSilenceMs, rigsAway, type RigDesk } from './rig-desk';
import type { RigOutlook } from './rig-outlook';

/** Whoever drives a rig is asked again so often to tell of it, ms. */
const askEveryMs = 4_000;
/** A page that does not look for so long follows no more, ms. */
const followedMs = 6_000;

export interface AcrossOutlookParts {
  post: ProcessPost;
  clock: Clock;
  desk: RigDesk;
}

interface Followed extends RigPlace {
  untilMs: number;
  /** The newest word, and when it came; null before the first. */
  told: (RigTold & { atMs: number }) | null;
  waiting: Set<() => void>;
}

const unheard: RigTold['beat'] = { link: 'lost', lastReplyAt: null, angleDeg: null, lockedBy: null };
const notDriven =
  'No process drives this rig at the moment, so nothing keeps the turntable moving: its motion lease lapses within 2 s. Use the switch at the rig if anything moves.';

/** What the process that drives a rig says of it, twice a second while pages of this one follow it. */
export class AcrossOutlook implements RigOutlook {
  private readonly followed = new Map<string, Followed>();
  private readonly asking: Repeated;

  constructor(private readonly parts: AcrossOutlookParts) {
    this.asking = new Repeated(parts.clock, askEveryMs, () => this.askAgain());
    parts.post.onMessage((message) => this.hear(message));
  }

  async follow(rig: RigPlace): Promise<void> {
    const followed = this.look(rig);
    if (this.freshOf(followed) !== null) return;
    const { clock } = this.parts;
    const heard = new Promise<boolean>((resolve) => {
      const cancel = clock.after(longestSilenceMs, () => {
        followed.waiting.delete(done);
        resolve(false);
      });
      const done = () => {
        cancel();
        resolve(true);
      };
      followed.waiting.add(done);
    });
    if (!(await heard)) throw rigsAway('Nothing is known of it at the moment.');
  }

  line(rig: RigPlace): LineMessage | null {
    return this.freshOf(this.look(rig))?.line ?? null;
  }

  beat(rig: RigPlace): RigTold['beat'] {
    const followed = this.look(rig);
    const fresh = this.freshOf(followed);
    return fresh?.beat ?? { ...(followed.told?.beat ?? unheard), link: 'lost', angleDeg: null, notDriven };
  }

  async view({ labId, runId, rigId }: { labId: string; runId: string; rigId: string }): Promise<RunView | null> {
    const question = { route: 'getRun', params: { labId, runId }, query: {}, body: undefined, ifMatch: null, me: null };
    const membership = { labId, labName: '', timeZone: 'UTC', role: 'viewer' as const };
    const which = () => Promise.resolve({ labId, rigId });
    try {
      const answer = await this.parts.desk.ask({ question: { ...question, membership }, which, urgent: true, elseStored: true });
      return answer.body as RunView;
    } catch (error) {
      if (error instanceof ProblemError && error.code === 'not-found') return null;
      throw error;
    }
  }

  close(): void {
    this.asking.end();
  }

  private look({ labId, rigId }: RigPlace): Followed {
    const known = this.followed.get(rigId);
    const followed: Followed = known ?? { labId, rigId, untilMs: 0, told: null, waiting: new Set() };
    followed.untilMs = this.parts.clock.monotonicMs() + followedMs;
    this.followed.set(rigId, followed);
    if (known === undefined) this.askFor([{ labId, rigId }]);
    this.asking.keep();
    return followed;
  }

  private freshOf({ told }: Followed): RigTold | null {
    return told !== null && this.parts.clock.monotonicMs() - told.atMs <= longestSilenceMs ? told : null;
  }

  private hear(message: ProcessMessage): void {
    if (message.kind !== 'rig') return;
    const followed = this.followed.get(message.rigId);
    if (followed?.labId !== message.labId) return;
    followed.told = { line: message.line, beat: message.beat, atMs: this.parts.clock.monotonicMs() };
    for (const done of followed.waiting) done();
    followed.waiting.clear();
  }

  /** Whether any page follows still. */
  private askAgain(): boolean {
    const nowMs = this.parts.clock.monotonicMs();
    for (const { rigId, untilMs, waiting } of [...this.followed.values()])
      if (untilMs <= nowMs && waiting.size === 0) this.followed.delete(rigId);
    if (this.followed.size === 0) return false;
    this.askFor([...this.followed.values()].map(({ labId, rigId }) => ({ labId, rigId })));
    return true;
  }

  private askFor(rigs: readonly RigPlace[]): void {
    this.parts.post.tell({ kind: 'follow', rigs }).catch(() => undefined);
  }
}
