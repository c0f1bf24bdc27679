import { StepTrack } from './step-track';

/** The table behind the motor, in microsteps from the home edge: steps turn it, with play, unless the belt slips. */
export class Turntable {
  readonly track: StepTrack;
  private place: number;
  private motor: number;

  constructor(
    start: number,
    private readonly backlash: number,
    /** Microsteps of a turn, where the table may make whole turns; null: the flag covers all places below the edge. */
    private readonly turn: number | null = null,
  ) {
    this.place = start;
    // As if it had been approached counter-clockwise: the play is on the other side.
    this.motor = start + backlash;
    this.track = new StepTrack(start);
  }

  /** SPEC 8.6: the flag covers all places below the edge; on a table that makes whole turns the half turn below it. */
  get covered(): boolean {
    const { place, turn } = this;
    return turn === null ? place < 0 : place - turn * Math.floor(place / turn) >= turn / 2;
  }

  step(direction: 1 | -1, cycle: number): void {
    this.motor += direction;
    this.settle(cycle);
  }

  /** The belt slips by so many microsteps, counter-clockwise where positive: the motor does not know. */
  slip(steps: number, cycle: number): void {
    this.motor += steps;
    this.settle(cycle, this.place + steps);
  }

  state() {
    return { place: this.place, motor: this.motor };
  }

  restore({ place, motor }: ReturnType<Turntable['state']>, cycle: number): void {
    this.motor = motor;
    this.settle(cycle, place);
  }

  private settle(cycle: number, pushedTo = this.place): void {
    const place = Math.min(this.motor, Math.max(this.motor - this.backlash, pushedTo));
    if (place === this.place) return;
    this.place = place;
    this.track.add(cycle, place);
  }
}
