import { hex8, NO_SESSION, type NoBody } from '@/firmware-protocol/codec';

/** What identifies a request: its epoch, session and number, and its bytes. */
export interface Incoming {
  epoch: number;
  session: string;
  number: number;
}

export type Admission = { kind: 'new' } | { kind: 'repetition'; reply: string } | { kind: 'refused'; body: NoBody };

/** Numbers go up modulo 65536; the nearer half of the circle is ahead (SPEC 3.6). */
const HALF_RANGE = 0x8000;

/** The session, the epoch fence and the stored reply of the simulated controller (SPEC 3). */
export class SessionDesk {
  private session = NO_SESSION;
  private count = 0;
  private epoch = 0;
  /** In non-volatile memory: a reset does not lower it. */
  highestEpoch = 0;
  private lastNumber = 0;
  private stored: { line: string; reply: string } | null = null;

  /** Opens a session for a driver whose epoch is not too old; null when it is (SPEC 3.3). */
  open(epoch: number, bootCount: number): string | null {
    if (epoch < this.highestEpoch) return null;
    this.highestEpoch = epoch;
    this.epoch = epoch;
    this.count += 1;
    this.session = hex8(((bootCount & 0xffff) << 16) | (this.count & 0xffff));
    this.lastNumber = 0;
    this.stored = null;
    return this.session;
  }

  /** A restart of the controller. */
  forget(): void {
    this.session = NO_SESSION;
    this.count = 0;
    this.epoch = 0;
    this.stored = null;
  }

  isOpen(session: string): boolean {
    return session === this.session && session !== NO_SESSION;
  }

  admit(incoming: Incoming, line: string): Admission {
    if (!this.isOpen(incoming.session)) return refused('session');
    if (incoming.epoch !== this.epoch) return refused('epoch', this.highestEpoch);
    const ahead = (incoming.number - this.lastNumber) & 0xffff;
    if (ahead === 0) return this.repetition(incoming, line) ?? refused('reused');
    return ahead < HALF_RANGE ? { kind: 'new' } : refused('old', this.lastNumber);
  }

  /** The stored reply when this is the last request once more, byte for byte. */
  repetition(incoming: Incoming, line: string): Admission | null {
    return this.isOpen(incoming.session) && this.stored?.line === line ? { kind: 'repetition', reply: this.stored.reply } : null;
  }

  /** Remembers a request that was carried out. A stop from elsewhere, or with an old number, changes nothing here (SPEC 9.4). */
  keep(incoming: Incoming, line: string, reply: string): void {
    const ahead = (incoming.number - this.lastNumber) & 0xffff;
    if (!this.isOpen(incoming.session) || ahead === 0 || ahead >= HALF_RANGE) return;
    this.lastNumber = incoming.number;
    this.stored = { line, reply };
  }
}

function refused(code: 'session' | 'epoch' | 'reused' | 'old', detail = 0): Admission {
  return { kind: 'refused', body: { word: 'no', code, detail } };
}
