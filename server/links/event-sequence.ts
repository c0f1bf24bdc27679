import type { EventMessage } from '@/firmware-protocol/codec';

/**
 * Puts the controller's numbered events into order and knows which are missing, so that a lost line loses no
 * timestamp (SPEC 7.5): nothing is given on before everything before it.
 */
export class EventSequence {
  /** Number of the last event given on. */
  private last = 0;
  /** Greatest number that is known to exist. */
  private newest = 0;
  private readonly early = new Map<number, EventMessage>();
  /** Events up to this number happened before anybody here listened. */
  private past = 0;

  /** What came up to `number` is past; of it there is what the ring still keeps, from its oldest event on. */
  startAfter(number: number): void {
    this.past = number;
    this.last = 0;
    this.newest = number;
    this.early.clear();
  }

  /** Begins anew with the oldest event that the controller keeps. */
  rereadAll(): void {
    this.last = 0;
    this.early.clear();
  }

  isPast(number: number): boolean {
    return number <= this.past;
  }

  /** A reply told that events up to `number` have happened. */
  heardOf(number: number): void {
    this.newest = Math.max(this.newest, number);
  }

  /** The events that can be given on now, in order; none for one that is known already. */
  add(event: EventMessage): EventMessage[] {
    if (event.number <= this.last) return [];
    this.heardOf(event.number);
    this.early.set(event.number, event);
    return this.ready();
  }

  /** Events before `oldest` are lost for good. */
  skipTo(oldest: number): EventMessage[] {
    this.last = Math.max(this.last, oldest - 1);
    return this.ready();
  }

  /** First number that is missing; null when all are here. */
  get missing(): number | null {
    return this.last < this.newest ? this.last + 1 : null;
  }

  hasGivenOn(number: number): boolean {
    return this.last >= number;
  }

  private ready(): EventMessage[] {
    const events: EventMessage[] = [];
    for (let event = this.early.get(this.last + 1); event !== undefined; event = this.early.get(this.last + 1)) {
      this.last += 1;
      this.early.delete(this.last);
      events.push(event);
    }
    return events;
  }
}
