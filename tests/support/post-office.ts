import type { Addressee, ProcessMessage, ProcessPost, RigQuestion, RigReply } from '@/server/interfaces/process-post';

interface Laid {
  question: RigQuestion;
  takenBy: string | null;
  reply: RigReply | null;
}

/** The post of several processes in one: messages go as JSON, and a process can be made deaf. */
export class PostOffice {
  readonly laid = new Map<string, Laid>();
  readonly drivers = new Map<string, string>();
  readonly said: ProcessMessage[] = [];
  private readonly posts = new Map<string, OfficePost>();

  process(name: string): OfficePost {
    const post = new OfficePost(name, this);
    this.posts.set(name, post);
    return post;
  }

  tell(from: string, message: ProcessMessage): void {
    this.said.push(message);
    for (const [name, post] of this.posts) if (name !== from) post.hear(JSON.parse(JSON.stringify(message)) as ProcessMessage);
  }
}

export class OfficePost implements ProcessPost {
  deaf = false;
  private readonly listeners: ((message: ProcessMessage) => void)[] = [];
  private readonly gapListeners: (() => void)[] = [];

  constructor(
    readonly process: string,
    private readonly office: PostOffice,
  ) {}

  hear(message: ProcessMessage): void {
    if (!this.deaf) for (const listener of this.listeners) listener(message);
  }

  /** The line stands again after it was broken. */
  hearAgain(): void {
    this.deaf = false;
    for (const listener of this.gapListeners) listener();
  }

  async open(): Promise<void> {}

  async close(): Promise<void> {}

  hears(): boolean {
    return !this.deaf;
  }

  async tell(message: ProcessMessage): Promise<void> {
    this.office.tell(this.process, message);
  }

  onMessage(listener: (message: ProcessMessage) => void): void {
    this.listeners.push(listener);
  }

  onGap(listener: () => void): void {
    this.gapListeners.push(listener);
  }

  async ask(question: RigQuestion, { labId, id, to }: { labId: string; id: string; to: Addressee }): Promise<void> {
    this.office.laid.set(id, { question, takenBy: null, reply: null });
    await this.tell({ kind: 'question', labId, id, to });
  }

  async take({ id }: { id: string }): Promise<RigQuestion | null> {
    const laid = this.office.laid.get(id);
    if (laid === undefined || laid.takenBy !== null) return null;
    laid.takenBy = this.process;
    return laid.question;
  }

  async withdraw({ id }: { id: string }): Promise<boolean> {
    return this.office.laid.get(id)?.takenBy === null && this.office.laid.delete(id);
  }

  async reply({ labId, id }: { labId: string; id: string }, reply: RigReply): Promise<void> {
    const laid = this.office.laid.get(id);
    if (laid !== undefined) laid.reply = reply;
    await this.tell({ kind: 'answered', labId, id });
  }

  async collect({ id }: { id: string }): Promise<RigReply | null> {
    const reply = this.office.laid.get(id)?.reply ?? null;
    if (reply !== null) this.office.laid.delete(id);
    return reply;
  }

  async driversIn(): Promise<{ rigId: string; process: string }[]> {
    return [...this.office.drivers].map(([rigId, process]) => ({ rigId, process }));
  }
}
