import { StepTrack } from './step-track';

/** The table behind the motor, in microsteps from the home edge: steps turn it, with play, unless the belt slips. */
export class Turntable {
  readonly track: StepTrack;
  private place: number;
  private motor: number;

  constructor(
    start: number,
    private readonly backlash: number,
  ) {
    this.place = start;
    // As if it had been approached counter-clockwise: the play is on the other side.
    this.motor = start + backlash;
    this.track = new StepTrack(start);
  }

  /** SPEC 8.6: the flag covers all places below the edge. */
  get covered(): boolean {
    return this.place < 0;
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
