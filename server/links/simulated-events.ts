import { EVENT_RING, type EventMessage, type Happening } from '@/firmware-protocol/codec';

/** The numbered events that the simulated controller keeps (SPEC 7.3). */
export class EventRing {
  private kept: EventMessage[] = [];
  /** Number of the newest event; 0 before the first. */
  newest = 0;

  get oldest(): number {
    return this.kept[0]?.number ?? 0;
  }

  note(what: Happening, atUs: number): EventMessage {
    this.newest += 1;
    const event: EventMessage = { kind: 'event', number: this.newest, atUs, what };
    this.kept.push(event);
    if (this.kept.length > EVENT_RING) this.kept.shift();
    return event;
  }

  from(number: number, count: number): EventMessage[] {
    return this.kept.filter((event) => event.number >= number).slice(0, count);
  }

  clear(): void {
    this.kept = [];
    this.newest = 0;
  }
}
