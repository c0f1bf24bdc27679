/** Steps kept for those who ask about the past: many minutes of ordinary swings, 8 s at the greatest speed. */
const KEPT = 1 << 16;

/** Where the table was after each step, as a staircase over any time scale that grows. */
export class StepTrack {
  private readonly times = new Float64Array(KEPT);
  private readonly places = new Int32Array(KEPT);
  /** Number of the newest entry, counted from the beginning. */
  private newest = 0;

  constructor(start: number) {
    this.times[0] = -Infinity;
    this.places[0] = start;
  }

  get count(): number {
    return this.newest;
  }

  add(time: number, place: number): void {
    this.newest += 1;
    this.times[this.newest % KEPT] = time;
    this.places[this.newest % KEPT] = place;
  }

  /** The place at a time; before everything that is kept: the oldest place. */
  at(time: number): number {
    let low = Math.max(0, this.newest - KEPT + 1);
    let high = this.newest;
    while (low < high) {
      const middle = Math.ceil((low + high) / 2);
      if ((this.times[middle % KEPT] as number) <= time) low = middle;
      else high = middle - 1;
    }
    return this.places[low % KEPT] as number;
  }

  /** The entries after number `from`, as far as they are kept. */
  after(from: number): { time: number; place: number }[] {
    const entries = [];
    for (let number = Math.max(from + 1, this.newest - KEPT + 1); number <= this.newest; number += 1)
      entries.push({ time: this.times[number % KEPT] as number, place: this.places[number % KEPT] as number });
    return entries;
  }
}
