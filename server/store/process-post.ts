import type { Logger } from 'pino';
import { listenOn, type Listening } from '@/db/listen';
import type { Cancel, Clock } from '../interfaces/clock';
import type { ProcessMessage, ProcessPost, RigQuestion, RigReply } from '../interfaces/process-post';
import type { Connection } from './database';
import { Pieces, toPieces } from './pieces';
import { driversOf } from './rig-leases';
import { answerQuestion, collectAnswer, layQuestion, takeQuestion, withdrawQuestion } from './rig-questions';

export interface PostParts {
  /** Name of this process. */
  process: string;
  url: string;
  database: Connection;
  clock: Clock;
  log: Logger;
}

const channel = 'evenfall';
const retryMs = 250;

interface Key {
  labId: string;
  id: string;
}

/** The post of the processes of one PostgreSQL database: LISTEN and NOTIFY on a connection of its own, questions in a table. */
export class DatabasePost implements ProcessPost {
  private readonly listeners: ((message: ProcessMessage) => void)[] = [];
  private readonly gapListeners: (() => void)[] = [];
  private readonly pieces = new Pieces();
  private line: Listening | null = null;
  private number = 0;
  private wasOpen = false;
  private closed = false;
  private opening: Promise<void> = Promise.resolve();
  private cancel: Cancel = () => undefined;

  constructor(private readonly parts: PostParts) {}

  get process(): string {
    return this.parts.process;
  }

  /** Listens, and again whenever the line broke. Resolves after the first attempt. */
  open(): Promise<void> {
    this.opening = this.connect();
    return this.opening;
  }

  async close(): Promise<void> {
    this.closed = true;
    this.cancel();
    await this.opening;
    await this.line?.close().catch(() => undefined);
    this.line = null;
  }

  hears(): boolean {
    return this.line !== null;
  }

  onMessage(listener: (message: ProcessMessage) => void): void {
    this.listeners.push(listener);
  }

  onGap(listener: () => void): void {
    this.gapListeners.push(listener);
  }

  async tell(message: ProcessMessage): Promise<void> {
    if (this.line === null) throw Object.assign(new Error('the line to the other processes is broken'), { code: 'ECONNRESET' });
    this.number += 1;
    await this.line.notify(toPieces(this.process, this.number, message));
  }

  async ask(question: RigQuestion, { to, ...key }: Parameters<ProcessPost['ask']>[1]): Promise<void> {
    const { database, clock } = this.parts;
    await layQuestion(database.db, key, { question, nowUtcMs: clock.utcMs() });
    await this.tell({ kind: 'question', ...key, to });
  }

  take(key: Key): Promise<RigQuestion | null> {
    return takeQuestion(this.parts.database.db, key, this.process);
  }

  withdraw(key: Key): Promise<boolean> {
    return withdrawQuestion(this.parts.database.db, key);
  }

  async reply(key: Key, reply: RigReply): Promise<void> {
    await answerQuestion(this.parts.database.db, key, reply);
    await this.tell({ kind: 'answered', ...key });
  }

  collect(key: Key): Promise<RigReply | null> {
    return collectAnswer(this.parts.database.db, key);
  }

  driversIn(labId: string): Promise<{ rigId: string; process: string }[]> {
    return driversOf(this.parts.database.db, labId);
  }

  private async connect(): Promise<void> {
    if (this.closed) return;
    const { url, log } = this.parts;
    try {
      this.line = await listenOn({ url, channel, onPayload: (payload) => this.heard(payload), onLost: (error) => this.lost(error) });
    } catch (error) {
      log.debug({ err: error }, 'the line to the other processes could not be opened');
      this.again();
      return;
    }
    if (this.wasOpen) for (const listener of this.gapListeners) listener();
    this.wasOpen = true;
  }

  private lost(error: Error): void {
    this.line = null;
    this.pieces.clear();
    this.parts.log.warn({ err: error }, 'the line to the other processes broke');
    this.again();
  }

  private again(): void {
    if (this.closed) return;
    this.cancel = this.parts.clock.after(retryMs, () => void this.open());
  }

  private heard(payload: string): void {
    const message = this.pieces.add(payload, this.process) as ProcessMessage | null;
    if (message === null) return;
    for (const listener of this.listeners) {
      try {
        listener(message);
      } catch (error) {
        this.parts.log.error({ err: error, kind: message.kind }, 'what another process said could not be heeded');
      }
    }
  }
}
