import { problemCodes } from '@/shared/contracts/problem';
import type { Addressee, ProcessMessage, ProcessPost, RigQuestion, RigReply } from '@/server/interfaces/process-post';
import { problemErrorOf } from '../errors';
import type { RigDesk } from './rig-desk';

export interface ClerkParts {
  post: ProcessPost;
  here: RigDesk;
  drives(rigId: string): boolean;
  databaseAwaySinceUtcMs(): number | null;
  onError(error: unknown, question: RigQuestion): void;
  background(work: Promise<unknown>, what: string): void;
}

/** Urgent questions are said several times; so many answers are remembered. */
const keptReplies = 500;

/** Answers, in a process that drives rigs, what others ask of them. */
export class DeskClerk {
  private closed = false;
  private readonly urgent = new Map<string, Promise<RigReply>>();

  constructor(private readonly parts: ClerkParts) {
    parts.post.onMessage((message) => this.hear(message));
  }

  /** Takes no more questions. */
  close(): void {
    this.closed = true;
  }

  private hear(message: ProcessMessage): void {
    if (message.kind !== 'question' && message.kind !== 'urgent') return;
    if (this.closed || !this.isMine(message.to)) return;
    const work = message.kind === 'urgent' ? this.answerUrgent(message) : this.answerLaid(message);
    this.parts.background(work, 'an answer to another process');
  }

  private isMine(to: Addressee): boolean {
    const { post, drives } = this.parts;
    if (to === 'any') return true;
    return 'process' in to ? to.process === post.process : drives(to.rigId);
  }

  /** Acted upon at once; a question that was heard before gets the same answer again. */
  private async answerUrgent({ id, question }: { id: string; question: RigQuestion }): Promise<void> {
    const known = this.urgent.get(id);
    const reply = known ?? this.replyTo(question);
    if (known === undefined) {
      this.urgent.set(id, reply);
      const oldest = this.urgent.size > keptReplies ? this.urgent.keys().next().value : undefined;
      if (oldest !== undefined) this.urgent.delete(oldest);
    }
    await this.parts.post.tell({ kind: 'urgent-answered', id, reply: await reply });
  }

  private async answerLaid({ labId, id }: { labId: string; id: string }): Promise<void> {
    const { post } = this.parts;
    const key = { labId, id };
    const question = await post.take(key);
    if (question !== null) await post.reply(key, await this.replyTo(question));
  }

  private async replyTo(question: RigQuestion): Promise<RigReply> {
    const { here, onError, databaseAwaySinceUtcMs } = this.parts;
    try {
      const asked = { question, which: () => Promise.resolve(null), urgent: false, elseStored: false };
      return { kind: 'answer', ...(await here.ask(asked)) };
    } catch (error) {
      const { code, detail, errors = null, retryAfterS = null } = problemErrorOf(error, databaseAwaySinceUtcMs());
      if (problemCodes[code] >= 500) onError(error, question);
      return { kind: 'problem', code, detail, errors, retryAfterS };
    }
  }
}
