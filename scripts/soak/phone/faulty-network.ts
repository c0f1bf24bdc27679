import type { Cancel } from '@/server/interfaces/clock';
import type { Answer, LabSide } from './lab-side';
import type { VirtualTime } from './virtual-time';

/** What may come between a phone and its server. */
export const phoneFaults = ['offline', 'slow 3G', '10 % loss', 'portal', 'DNS', 'frozen tab', '503', 'flight mode mid-tap'] as const;
export type PhoneFault = (typeof phoneFaults)[number];

/** One way, ms: an ordinary mobile network, and the slow 3G of browsers' tools with its round trip of 2 s (figures of common practice, no source). */
const onTheWayMs = { usual: 60, slow: 1000 };
const lookUpMs = 4000;
const page = '<html><title>Sign in to the network</title></html>';

interface Asked {
  act: 'resume' | 'stop' | 'view';
  key: string;
  tappedAt: string;
  atMs: number;
}

/** The network of one phone: `fetch` and `EventSource` as a browser has them, over a line that may be bad. */
export class FaultyNetwork {
  private fault: PhoneFault | null = null;
  private streams = new Set<Stream>();
  /** Every POST that left the phone. */
  readonly posts: Asked[] = [];

  readonly time: VirtualTime;
  readonly lab: LabSide;
  private readonly random: () => number;

  constructor({ time, lab, random }: { time: VirtualTime; lab: LabSide; random: () => number }) {
    this.time = time;
    this.lab = lab;
    this.random = random;
  }

  become(fault: PhoneFault | null): void {
    this.fault = fault;
    if (fault !== null && fault !== 'slow 3G' && fault !== 'frozen tab') for (const stream of [...this.streams]) stream.breaks();
  }

  get isDead(): boolean {
    return this.fault === 'offline' || this.fault === 'flight mode mid-tap' || this.fault === 'DNS';
  }

  /** Whether what is on the line now gets lost. */
  private loses(): boolean {
    return this.isDead || (this.fault === '10 % loss' && this.random() < 0.1);
  }

  delayMs(): number {
    return (this.fault === 'slow 3G' ? onTheWayMs.slow : onTheWayMs.usual) * (1 + this.random());
  }

  /** What answers in place of the server, if anything does. */
  get impostor(): Answer | null {
    if (this.fault === 'portal') return { status: 200, body: page };
    return this.fault === '503' ? { status: 503, body: page } : null;
  }

  fetch = (address: string, init: RequestInit): Promise<Response> => {
    const act = init.method === 'GET' ? 'view' : address.endsWith('/stop') ? 'stop' : 'resume';
    const { tappedAt = '' } = typeof init.body === 'string' ? (JSON.parse(init.body) as { tappedAt?: string }) : {};
    const asked: Asked = { act, key: new Headers(init.headers).get('idempotency-key') ?? '', tappedAt, atMs: this.time.utcMs() };
    if (act !== 'view') this.posts.push(asked);
    return new Promise((resolve, reject) => {
      const { signal } = init;
      signal?.addEventListener('abort', () => reject(new DOMException('aborted', 'AbortError')));
      const fails = (afterMs: number) => this.time.onPhone(afterMs, () => reject(new TypeError('Failed to fetch')));
      if (this.isDead) return void fails(this.fault === 'DNS' ? lookUpMs : 5);
      const { impostor } = this;
      const lost = this.loses();
      this.time.after(this.delayMs(), () => {
        // Lost on the way: nobody ever answers.
        if (lost || (impostor === null && this.loses())) return;
        const { status, body } = impostor ?? this.lab.answer(act, asked);
        const answered = { ok: status < 300, status, headers: new Headers(), json: async () => (body === page ? undefined : body) };
        this.time.after(this.delayMs(), () => (this.loses() ? undefined : this.time.onPhone(0, () => resolve(answered as Response))));
      });
    });
  };

  /** The `EventSource` of this phone. */
  eventSource(heard: (type: string, id: number | null, data: string) => void): typeof EventSource {
    const makes = (made: Stream) => void this.streams.add(made);
    const lets = (gone: Stream) => void this.streams.delete(gone);
    const network = this;
    return class extends Stream {
      constructor() {
        super(network, { heard, lets });
        makes(this);
      }
    } as unknown as typeof EventSource;
  }
}

interface StreamEnds {
  heard: (type: string, id: number | null, data: string) => void;
  lets: (stream: Stream) => void;
}

/** Reconnects by itself with the last id it saw, 2 s after a break; what is no event stream ends it for good (HTML Living Standard, 9.2). */
class Stream {
  readyState = 0;
  onopen: (() => void) | null = null;
  onerror: (() => void) | null = null;
  private readonly listeners = new Map<string, (event: { data: string }) => void>();
  private lastId: number | null = null;
  private leave: Cancel | null = null;
  private connection = 0;
  private lastArrivesMs = 0;

  constructor(
    private readonly network: FaultyNetwork,
    private readonly ends: StreamEnds,
  ) {
    this.connect();
  }

  addEventListener(type: string, listener: (event: { data: string }) => void): void {
    this.listeners.set(type, listener);
  }

  close(): void {
    this.readyState = 2;
    this.drop();
    this.ends.lets(this);
  }

  breaks(): void {
    if (this.readyState === 2) return;
    this.drop();
    this.readyState = 0;
    const { time } = this.network;
    time.onPhone(5, () => this.onerror?.());
    time.onPhone(2000, () => (this.readyState === 2 ? undefined : this.connect()));
  }

  private drop(): void {
    this.connection += 1;
    this.leave?.();
    this.leave = null;
  }

  private connect(): void {
    const { time, impostor, isDead, lab } = this.network;
    if (isDead) return this.breaks();
    const { connection } = this;
    time.after(this.network.delayMs(), () => {
      if (connection !== this.connection) return;
      if (impostor !== null) {
        this.close();
        time.onPhone(0, () => this.onerror?.());
        return;
      }
      this.leave = lab.follow(this.lastId, (text) => this.arrives(text));
      time.onPhone(0, () => {
        if (connection !== this.connection) return;
        this.readyState = 1;
        this.onopen?.();
      });
    });
  }

  /** A stream keeps its order: what is late holds up what follows it. */
  private arrives(text: string): void {
    const { time } = this.network;
    const { connection } = this;
    this.lastArrivesMs = Math.max(this.lastArrivesMs, time.utcMs() + this.network.delayMs());
    time.after(this.lastArrivesMs - time.utcMs(), () =>
      time.onPhone(0, () => {
        if (connection === this.connection) for (const block of text.split('\n\n')) this.reads(block);
      }),
    );
  }

  private reads(block: string): void {
    const field = (name: string) => new RegExp(`^${name}: (.*)$`, 'm').exec(block)?.[1];
    const [id, type, data] = [field('id'), field('event'), field('data')];
    if (id !== undefined) this.lastId = Number(id);
    if (type === undefined || data === undefined) return;
    this.ends.heard(type, id === undefined ? null : Number(id), data);
    this.listeners.get(type)?.({ data });
  }
}
