import type { RunStart, StepOutcome, StepRow } from '@/shared/archive/run-records';
import type { Instant } from '../interfaces/clock';
import { copied } from './copied';
import type { LinkCommand } from '../interfaces/turntable-link';
import { noteVerdict } from './verdict';
import type { Look } from './look';
import { noteRowClosed } from './position';
import type {
  ActiveStep,
  Effect,
  Happening,
  KnownController,
  Motion,
  NoticeTopic,
  Reason,
  RunContext,
  RunEvent,
  RunEventOf,
  RunEventType,
} from './run-context';

/** What one transition gives out besides the new context. */
export interface Output {
  steps: StepRow[];
  events: Happening[];
  effects: Effect[];
}

export const nothingOut: Output = { steps: [], events: [], effects: [] };

export interface RowEnd {
  at: Instant;
  angleDeg: number | null;
  outcome: StepOutcome;
}

/**
 * A working copy of the context in which one action of the chart writes; what it was made from stays as it was, so the
 * chart as a whole is a pure function.
 */
export class Draft {
  readonly context: RunContext;
  readonly out: Output;
  /** The predicted finish, UTC ms, where whoever only asks what would be knows it already. */
  readonly predictedEndUtcMs: number | null;

  constructor(
    readonly start: RunStart,
    readonly event: RunEvent,
    from: { context: RunContext; out: Output; predictedEndUtcMs?: number | null },
  ) {
    this.predictedEndUtcMs = from.predictedEndUtcMs ?? null;
    this.context = copied(from.context);
    this.out = { steps: [...from.out.steps], events: [...from.out.events], effects: [...from.out.effects] };
  }

  get nowUtcMs(): number {
    return this.event.at.utcMs;
  }

  /** The event, which the chart has brought here only when it is of this type. */
  told<T extends RunEventType>(type: T): RunEventOf<T> {
    if (this.event.type !== type) throw new Error(`${this.event.type} was taken for ${type}`);
    return this.event as RunEventOf<T>;
  }

  /** The present step; the chart is in a state that has one. */
  get step(): ActiveStep {
    const { step } = this.context;
    if (step === null) throw new Error('there is no present step');
    return step;
  }

  /** The motion of the present step, likewise. */
  get motion(): Motion {
    const { motion } = this.step;
    if (motion === null) throw new Error('the present step has no motion');
    return motion;
  }

  /** The controller's own stamp where the event carries one, else the server's. */
  get stamp(): Instant {
    return 'link' in this.event ? this.event.link.at : this.event.at;
  }

  /** The controller as last heard of; the run never gets beyond `starting` without one. */
  get controller(): KnownController {
    const known = this.context.controller;
    if (known === null) throw new Error('the run went on before a controller had answered');
    return known;
  }

  log(kind: string, data: Record<string, unknown> = {}, at: Instant = this.stamp): void {
    this.out.events.push({ at, kind, data });
  }

  command(make: (id: string) => LinkCommand): string {
    const id = this.nextId();
    this.out.effects.push({ kind: 'link', id, command: make(id) });
    return id;
  }

  notify(topic: NoticeTopic, text: string): void {
    this.out.effects.push({ kind: 'notify', id: this.nextId(), topic, text });
  }

  look(look: Look): void {
    this.out.effects.push({ kind: 'look', id: this.nextId(), look });
  }

  voidArm(reason: string): void {
    this.context.armVoid = reason;
    this.out.effects.push({ kind: 'void-arm', id: this.nextId(), reason });
  }

  /** Takes up a row that was begun or changed, so that the transition saves it. */
  saveRow(row: StepRow): void {
    const { steps } = this.out;
    const last = steps.at(-1);
    if (last === undefined || last.seq < row.seq) {
      steps.push(structuredClone(row));
      return;
    }
    const index = steps.findIndex(({ seq }) => seq >= row.seq);
    steps.splice(index, steps[index]?.seq === row.seq ? 1 : 0, structuredClone(row));
  }

  /** Makes `step` the present one and opens its row, whose sequence number is given here. */
  openStep(step: ActiveStep): void {
    if (step.pause === true) {
      step.row.seq = this.context.rowCount;
      this.context.step = step;
      return;
    }
    this.context.rowCount += 1;
    step.row.seq = this.context.rowCount;
    this.context.step = step;
    this.saveRow(step.row);
    const { seq, path, kind, label, station, startUtcMs, uStartS } = step.row;
    this.log('step-began', { seq, path, kind, label, station }, { utcMs: startUtcMs, uS: uStartS });
  }

  /** Closes the row of the present step; the step itself stays, so that a hold can be resumed. */
  closeRow({ at, angleDeg, outcome }: RowEnd): void {
    const { step } = this.context;
    if (step === null || step.row.outcome !== null) return;
    Object.assign(step.row, { endUtcMs: at.utcMs, uEndS: at.uS, angleEndDeg: angleDeg, outcome });
    if (step.row.kind === 'dwell') noteVerdict(this, step.row);
    step.broken = outcome === 'cut short';
    if (step.pause === true) return;
    noteRowClosed(this, step.row, step.motion !== null);
    this.saveRow(step.row);
    this.log('step-ended', { seq: step.row.seq, path: step.row.path, outcome, angleDeg }, at);
  }

  /** The sources stand at `angleDeg` since `at`: the next step begins there and then. */
  standAt(at: Instant, angleDeg: number): void {
    this.context.moment = { ...at, angleDeg };
  }

  because(code: string, text: string): Reason {
    const reason = { code, text };
    this.context.reason = reason;
    return reason;
  }

  private nextId(): string {
    this.context.commandCount += 1;
    return `${this.start.runId}-${this.context.commandCount}`;
  }
}
