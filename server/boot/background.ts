import type { Logger } from 'pino';

/** Work that goes on after its cause was answered. */
export class Background {
  private readonly works = new Set<Promise<void>>();

  constructor(private readonly log: Logger) {}

  add(work: Promise<unknown>, what: string): void {
    const watched = work.then(
      () => undefined,
      (error: unknown) => this.log.warn({ err: error }, `${what} failed`),
    );
    const done = watched.finally(() => this.works.delete(done));
    this.works.add(done);
  }

  async idle(): Promise<void> {
    while (this.works.size > 0) await Promise.all(this.works);
  }
}
