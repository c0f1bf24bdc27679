import type { Cancel, Clock } from '../interfaces/clock';

interface Task {
  dueMs: number;
  order: number;
  run: () => void;
}

/**
 * A clock that moves only when told to: rehearsals, simulated nights and tests run on it. After each task it waits
 * for `settle`, so that promises started by the task have done their work before time goes on.
 */
export class VirtualClock implements Clock {
  private nowMs = 0;
  private order = 0;
  private readonly heap: Task[] = [];

  constructor(
    private readonly startUtcMs: number,
    private readonly settle: () => Promise<void>,
  ) {}

  monotonicMs(): number {
    return this.nowMs;
  }

  utcMs(): number {
    return this.startUtcMs + this.nowMs;
  }

  after(delayMs: number, run: () => void): Cancel {
    const task: Task = { dueMs: this.nowMs + Math.max(0, delayMs), order: this.order++, run };
    push(this.heap, task);
    return () => {
      task.run = nothing;
    };
  }

  /** Runs everything that falls due within `durationMs`, then stands at its end. Stops early when `until` is met. */
  async advance(durationMs: number, until: () => boolean = never): Promise<void> {
    const endMs = this.nowMs + durationMs;
    await this.settle();
    while (!until()) {
      const next = this.heap[0];
      if (next === undefined || next.dueMs > endMs) {
        this.nowMs = endMs;
        return;
      }
      pop(this.heap);
      if (next.run === nothing) continue;
      this.nowMs = Math.max(this.nowMs, next.dueMs);
      next.run();
      await this.settle();
    }
  }
}

const nothing = () => undefined;
const never = () => false;

const before = (a: Task, b: Task) => a.dueMs < b.dueMs || (a.dueMs === b.dueMs && a.order < b.order);

function push(heap: Task[], task: Task): void {
  let index = heap.push(task) - 1;
  while (index > 0) {
    const parent = (index - 1) >> 1;
    if (!before(task, heap[parent] as Task)) break;
    heap[index] = heap[parent] as Task;
    index = parent;
  }
  heap[index] = task;
}

function pop(heap: Task[]): void {
  const last = heap.pop();
  if (last === undefined || heap.length === 0) return;
  let index = 0;
  for (;;) {
    let child = 2 * index + 1;
    if (child >= heap.length) break;
    if (child + 1 < heap.length && before(heap[child + 1] as Task, heap[child] as Task)) child += 1;
    if (!before(heap[child] as Task, last)) break;
    heap[index] = heap[child] as Task;
    index = child;
  }
  heap[index] = last;
}
