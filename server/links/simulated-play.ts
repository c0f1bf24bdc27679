/**
 * What lies between motor and table: the play of the drive, and slips of the belt. Positions in microsteps. Going counter-clockwise the
 * table follows the motor at once; after a turn to clockwise it stands until the play is taken up, and is then ahead by it.
 */
interface Leg {
  fromUs: number;
  /** Motor position at the beginning. */
  from: number;
  direction: 1 | -1;
  /** Table ahead of the motor by play, at the beginning. */
  ahead: number;
  /** Table off the motor by slips so far. */
  slipped: number;
}

/** Legs kept for those who ask about the past. */
const KEPT = 256;

export class Play {
  private legs: Leg[] = [{ fromUs: -Infinity, from: 0, direction: 1, ahead: 0, slipped: 0 }];

  constructor(private readonly backlash: number) {}

  /** The motor begins to turn in a direction. */
  turn(us: number, motor: number, direction: 1 | -1): void {
    this.add({ fromUs: us, from: motor, direction, ahead: this.aheadAt(us, motor), slipped: this.last.slipped });
  }

  /** The belt jumps: the table moves, the motor does not. */
  slip(us: number, motor: number, steps: number): void {
    const { direction, slipped } = this.last;
    this.add({ fromUs: us, from: motor, direction, ahead: this.aheadAt(us, motor), slipped: slipped + steps });
  }

  /** Where the table is when the motor is at `motor`. */
  tableAt(us: number, motor: number): number {
    return motor + this.aheadAt(us, motor) + this.legAt(us).slipped;
  }

  /** Motor position at which the table, driven in a direction, comes to `table`. */
  motorFor(table: number, direction: 1 | -1): number {
    return table - this.last.slipped - (direction < 0 ? this.backlash : 0);
  }

  private get last(): Leg {
    return this.legs.at(-1) as Leg;
  }

  private aheadAt(us: number, motor: number): number {
    const { from, direction, ahead } = this.legAt(us);
    const way = Math.abs(motor - from);
    return direction > 0 ? Math.max(0, ahead - way) : Math.min(this.backlash, ahead + way);
  }

  private legAt(us: number): Leg {
    return this.legs.findLast(({ fromUs }) => fromUs <= us) ?? (this.legs[0] as Leg);
  }

  private add(leg: Leg): void {
    this.legs.push(leg);
    if (this.legs.length > 2 * KEPT) this.legs = this.legs.slice(-KEPT);
  }
}
