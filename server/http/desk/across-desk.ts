import type { Clock } from '@/server/interfaces/clock';
import type { IdempotencyAnswer } from '@/server/interfaces/idempotency';
import type { Addressee, ProcessMessage, ProcessPost, RigPlace, RigQuestion, RigReply } from '@/server/interfaces/process-post';
import { isDatabaseAway } from '../../store/failures';
import { ProblemError } from '../problem-error';
import { addressOf, longestSilenceMs, maybeDone, nothingDone, rigsAway, type AskedOfRig, type RigDesk } from './rig-desk';

export interface AcrossParts {
  post: ProcessPost;
  clock: Clock;
  newId(): string;
  /** Whoever was asked answers for itself. */
  here: RigDesk;
  /** Reads what the database knows of rigs that no process keeps in memory. */
  recall(labId: string, isMeant: (rigId: string) => boolean): Promise<void>;
}

/** An urgent question is said again so often, should the other end have been out of hearing, ms. */
const againMs = 400;
/** Whoever has taken a question may take so long over it, ms. */
const longestWorkMs = 15_000;

interface Key {
  labId: string;
  id: string;
}

interface Waiting {
  key: Key;
  done(reply: RigReply): void;
}

/** The desk of a process without rigs: the question goes to the process that drives the rig, and its answer comes back. */
export class AcrossDesk implements RigDesk {
  private readonly waiting = new Map<string, Waiting>();

  constructor(private readonly parts: AcrossParts) {
    parts.post.onMessage((message) => this.hear(message));
  }

  async ask(asked: AskedOfRig): Promise<IdempotencyAnswer> {
    const which = await asked.which();
    if (which === null) return this.parts.here.ask(asked);
    const labId = which === 'any' ? (asked.question.membership?.labId ?? '') : which.labId;
    const stored = asked.elseStored && which !== 'any' ? which : null;
    // Where no process has the rig, nobody needs to be waited for.
    if (stored !== null && !(await this.isDriven(stored))) return this.askStored(asked, stored);
    try {
      return answerOf(await this.send(asked.question, { labId, to: addressOf(which), urgent: asked.urgent }));
    } catch (error) {
      if (stored === null || !(error instanceof ProblemError) || error.code !== 'rigs-away') throw error;
      return this.askStored(asked, stored);
    }
  }

  async askEach(question: RigQuestion, labId: string): Promise<IdempotencyAnswer> {
    const { post, here, recall } = this.parts;
    const drivers = await post.driversIn(labId);
    const processes = [...new Set(drivers.map((driver) => driver.process))];
    const parts = await Promise.all(
      processes.map(async (process) => {
        const reply = await this.send(question, { labId, to: { process }, urgent: true }).catch(() => null);
        const own = new Set(drivers.filter((driver) => driver.process === process).map(({ rigId }) => rigId));
        return reply === null ? [] : itemsOf(answerOf(reply)).filter(({ id }) => own.has(id));
      }),
    );
    const told = new Map(parts.flat().map((item) => [item.id, item]));
    await recall(labId, (rigId) => !told.has(rigId));
    const stored = await here.askEach(question, labId);
    return { ...stored, body: { ...(stored.body as object), items: itemsOf(stored).map((item) => told.get(item.id) ?? item) } };
  }

  private async isDriven({ labId, rigId }: RigPlace): Promise<boolean> {
    return (await this.parts.post.driversIn(labId)).some((driver) => driver.rigId === rigId);
  }

  private async askStored(asked: AskedOfRig, { labId, rigId }: RigPlace): Promise<IdempotencyAnswer> {
    await this.parts.recall(labId, (id) => id === rigId);
    return this.parts.here.ask(asked);
  }

  private async send(question: RigQuestion, how: { labId: string; to: Addressee; urgent: boolean }): Promise<RigReply> {
    const key = { labId: how.labId, id: this.parts.newId() };
    try {
      return await (how.urgent ? this.sendUrgent(question, key, how.to) : this.lay(question, { ...key, to: how.to }));
    } catch (error) {
      if (!isDatabaseAway(error)) throw error;
      throw new ProblemError(
        'rigs-away',
        'The database, through which this process reaches the rigs, does not answer; runs go on without it. Use the switch at the rig if anything must stand still.',
      );
    } finally {
      this.waiting.delete(key.id);
    }
  }

  private async sendUrgent(question: RigQuestion, key: Key, to: Addressee): Promise<RigReply> {
    const { post, clock } = this.parts;
    const reply = this.expect(key);
    const say = () => post.tell({ kind: 'urgent', id: key.id, to, question });
    let cancel = () => undefined as void;
    const again = () => {
      cancel = clock.after(againMs, () => {
        say().catch(() => undefined);
        again();
      });
    };
    again();
    try {
      await say();
      const found = await this.within(longestSilenceMs, reply);
      if (found === null) throw rigsAway('Whether it was heard is not known.');
      return found;
    } finally {
      cancel();
    }
  }

  /** A question that sets something in motion is taken once or withdrawn: what nobody took in time never happens. */
  private async lay(question: RigQuestion, key: Key & { to: Addressee }): Promise<RigReply> {
    const { post } = this.parts;
    const reply = this.expect(key);
    await post.ask(question, key);
    const soon = await this.within(longestSilenceMs, reply);
    if (soon !== null) return soon;
    if (await post.withdraw(key)) throw rigsAway(nothingDone);
    // It may have been answered while nobody here could hear.
    const found = (await post.collect(key)) ?? (await this.within(longestWorkMs - longestSilenceMs, reply));
    if (found === null) throw rigsAway(maybeDone);
    return found;
  }

  /** The reply, whenever it comes. */
  private expect(key: Key): Promise<RigReply> {
    return new Promise((resolve) => {
      this.waiting.set(key.id, { key, done: resolve });
    });
  }

  private within(ms: number, reply: Promise<RigReply>): Promise<RigReply | null> {
    return new Promise((resolve) => {
      const cancel = this.parts.clock.after(ms, () => resolve(null));
      void reply.then((found) => {
        cancel();
        resolve(found);
      });
    });
  }

  private hear(message: ProcessMessage): void {
    if (message.kind === 'urgent-answered') this.waiting.get(message.id)?.done(message.reply);
    if (message.kind !== 'answered') return;
    const waiting = this.waiting.get(message.id);
    if (waiting === undefined) return;
    this.parts.post.collect(waiting.key).then(
      (reply) => {
        if (reply !== null) waiting.done(reply);
      },
      () => undefined,
    );
  }
}

function answerOf(reply: RigReply): IdempotencyAnswer {
  if (reply.kind === 'answer') return { status: reply.status, body: reply.body, etag: reply.etag };
  const problem = new ProblemError(
    reply.code,
    reply.detail,
    reply.errors?.map(({ path, message, code }) => itemOf(path, message, code)),
  );
  throw reply.retryAfterS === null ? problem : problem.after(reply.retryAfterS);
}

const itemOf = (path: string, message: string, code: string | undefined) =>
  code === undefined ? { path, message } : { path, message, code };

const itemsOf = ({ body }: IdempotencyAnswer): { id: string }[] => (body as { items: { id: string }[] }).items;
