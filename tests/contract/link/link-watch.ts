import { createLink } from '@/server/links/link-driver';
import type { LinkCommand, LinkEvent, TurntableLink } from '@/server/interfaces/turntable-link';
import { benchRig, type LinkBench } from './bench';

type Kind = LinkEvent['kind'];
export type Heard<K extends Kind> = Extract<LinkEvent, { kind: K }>;

/** A link on a bench with everything it told, and short words for what tests do with it. */
export class LinkWatch {
  readonly heard: LinkEvent[] = [];
  readonly link: TurntableLink;
  mayRenew = true;
  private count = 0;
  private readonly bornMs: number;

  constructor(
    private readonly bench: LinkBench,
    private readonly epoch: number,
  ) {
    this.bornMs = Math.round(bench.clock.utcMs());
    this.link = createLink({ factory: bench.factory, clock: bench.clock, rig: benchRig, epoch });
    this.link.setLeaseRule(() => this.mayRenew);
    this.link.subscribe((event) => this.heard.push(event));
  }

  async ready(withinMs = 10_000): Promise<void> {
    this.link.open();
    await this.bench.until(`ready (${this.link.health().detail})`, () => this.link.health().condition === 'ready', withinMs);
  }

  move(targetDeg: number, startUtcMs: number | null = null): string {
    return this.send((id) => ({ kind: 'move', id, targetDeg, speedDegS: 30, accelerationDegS2: 60, startUtcMs }));
  }

  send(command: (id: string) => LinkCommand): string {
    this.count += 1;
    // With the time in it: a controller that was there before this test may have met the others (SPEC 3.8).
    const id = `command-${this.epoch}-${this.bornMs}-${this.count}`;
    this.link.send(command(id));
    return id;
  }

  all<K extends Kind>(kind: K, commandId?: string): Heard<K>[] {
    return this.heard.filter(
      (event) => event.kind === kind && (commandId === undefined || ('commandId' in event && event.commandId === commandId)),
    ) as Heard<K>[];
  }

  /** Waits for an event, told already or to come. */
  async get<K extends Kind>(kind: K, options: { of?: string; withinMs?: number; nth?: number } = {}): Promise<Heard<K>> {
    const { of, withinMs = 10_000, nth = 0 } = options;
    await this.bench.until(
      `${kind}${of === undefined ? '' : ` of ${of}`}; told so far: ${this.heard.map((event) => event.kind).join(', ')}`,
      () => this.all(kind, of).length > nth,
      withinMs,
    );
    return this.all(kind, of)[nth] as Heard<K>;
  }

  order(...kinds: Kind[]): Kind[] {
    return this.heard.map((event) => event.kind).filter((kind) => kinds.includes(kind));
  }
}
