import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ArmedRig } from './armed-rig';
import type { World } from './world';

/**
 * People who come to the rig in a night: they arm it, spoil an arming, walk in, lay hands into it under their personal lock, turn the key off. All that is drawn for them comes
 * from a stream of its own: the other faults of a seed are the same with and without them.
 */

interface Person {
  id: string;
  name: string;
}

const MOST_VISITS = 7;
const HOUR_MS = 3_600_000;
const EXIT_MS = 20_000;
const deeds = ['arm', 'arm', 'arm', 'arm', 'arm', 'spoil', 'hands', 'hands', 'lock from afar', 'key off', 'walk in', 'disarm'] as const;

export class Visitors {
  private readonly between: (least: number, greatest: number) => number;
  private count = 0;
  private ended = false;
  private told: (words: string) => void = () => undefined;

  constructor(
    private readonly world: World,
    private readonly rig: ArmedRig,
    seed: number,
  ) {
    const random = xoroshiro128plus(seed * 86_028_121 + 5);
    this.between = (least, greatest) => uniformInt(random, least, greatest);
  }

  /** Somebody arms the rig in the evening; when the run is to start, ms. */
  first(): number {
    this.arms(this.next());
    return this.world.nowMs + this.between(10_000, 50_000);
  }

  armsForTheNight(): void {
    this.arms(this.next(), 16 * HOUR_MS);
  }

  /** Draws who comes within `ms`, and tells it then. */
  begin(ms: number, tell: (words: string) => void): void {
    this.told = tell;
    for (let count = this.between(0, MOST_VISITS); count > 0; count -= 1) {
      const [deed, atMs] = [deeds[this.between(0, deeds.length - 1)] ?? 'arm', this.between(0, ms)];
      this.after(atMs, () => {
        tell(deed);
        this.comes(deed, this.next());
      });
    }
  }

  /** Nobody comes any more, and whoever is there leaves. */
  end(): void {
    this.ended = true;
    this.world.controller.closeInterlock();
  }

  private next(): Person {
    this.count += 1;
    return { id: `person ${this.count}`, name: `Visitor ${this.count}` };
  }

  private comes(deed: (typeof deeds)[number], who: Person): void {
    const { controller } = this.world;
    const { between } = this;
    switch (deed) {
      case 'arm':
        return this.arms(who);
      case 'spoil': {
        this.arms(who);
        const open = between(0, 1) === 0;
        return this.after(between(3_000, 24_000), () => (open ? this.opens(between(100, 40_000)) : controller.turnArmKey(false)));
      }
      case 'hands': {
        // A turn of the key before the lock is none for lifting it.
        if (between(0, 2) === 0) controller.turnArmKey(between(0, 1) === 0);
        return this.after(between(10, 4_000), () => {
          this.opens(between(5_000, 40_000));
          this.locks(who, between(3_000, 40_000));
        });
      }
      case 'lock from afar':
        return this.locks(who, between(3_000, 60_000));
      case 'key off':
        return controller.turnArmKey(false);
      case 'walk in':
        return this.opens(between(100, 20_000));
      default:
        return this.rig.disarms(who);
    }
  }

  /** Asks, turns the key on, and leaves through the door; then resumes or confirms from outside. */
  private arms(who: Person, lastsMs = this.between(0, 4) === 0 ? this.between(240_000, 720_000) : 16 * HOUR_MS, times = 3): void {
    const { world, between } = this;
    const { controller } = world;
    const asked = this.rig.asksToArm(who, world.machineClock.utcMs() + lastsMs);
    // Most people who read that it cannot be armed now come again later; some turn the key all the same.
    if (!asked && between(0, 5) > 0)
      return times > 0 ? this.after(between(5_000, 20_000), () => this.arms(who, lastsMs, times - 1)) : undefined;
    const [offMs, onMs, leavesMs] = [between(100, 1_000), between(1_200, 5_000), between(1_000, 12_000)];
    const [doorOpens, resumesMs] = [between(0, 2) === 0, between(500, 20_000)];
    this.after(offMs, () => controller.turnArmKey(false));
    this.after(onMs, () => controller.turnArmKey(true));
    if (doorOpens) this.after(onMs, () => this.opens(leavesMs));
    this.after(onMs + EXIT_MS + resumesMs, () => this.goesOn());
  }

  private goesOn(): void {
    const { world } = this;
    if (world.present === null || world.over) return;
    if (world.present.facts().waiting?.mayConfirm.ok === true) world.confirm();
    else if (world.present.state().state === 'held') world.resume();
  }

  private opens(ms: number): void {
    const { controller } = this.world;
    controller.openInterlock();
    this.world.clock.after(ms, () => controller.closeInterlock());
  }

  /** Hands are in the rig for so long; then the key is turned, the lock lifted, and the rig armed. */
  private locks(who: Person, ms: number): void {
    const { controller } = this.world;
    const { between } = this;
    const lock = this.rig.setsLock(who);
    if (lock === null) return;
    const [turnMs, liftMs, forgets] = [between(500, 3_000), between(200, 5_000), between(0, 5) === 0];
    if (between(0, 5) === 0) controller.turnArmKey(between(0, 1) === 0);
    if (!forgets) this.after(ms - turnMs, () => controller.turnArmKey(false));
    const lift = (left: number) => {
      void this.rig.liftsLock(lock).then((lifted) => {
        this.told(lifted ? `${who.name} lifts` : `${who.name} cannot lift`);
        if (lifted) this.after(between(500, 3_000), () => this.arms(this.next()));
        else if (left > 0) this.after(10_000, () => lift(left - 1));
      });
    };
    this.after(ms + liftMs, () => lift(2));
  }

  private after(ms: number, deed: () => void): void {
    this.world.clock.after(ms, () => this.ended || deed());
  }
}
