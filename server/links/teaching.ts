import type { Limits, LimitsBody, NoBody, ReplyBody, TeachOrder } from '@/firmware-protocol/codec';

/** What the controller answered; null: the line failed, or nothing came in time. */
export type TeachAnswer = LimitsBody | NoBody | null;

/** Lessons that get no answer are given up after so many requests: each waits half a second (`REPEAT_MS.ask`). */
const MOST_REQUESTS = 8;

/** Refusals of the request, not of what it asks for (SPEC 3.4, 3.6). */
const NOT_AN_ANSWER = ['session', 'old', 'reused'];

/**
 * Limits on their way to the controller, one lesson after the other. To teach the same limits twice is no harm, so an
 * unanswered request is made again under a new number.
 */
export class Teaching {
  private readonly lessons: { order: TeachOrder; requests: number; answered(answer: TeachAnswer): void }[] = [];

  add(limits: Limits): Promise<TeachAnswer> {
    return new Promise((answered) => {
      this.lessons.push({ order: { word: 'teach', ...limits }, requests: 0, answered });
    });
  }

  /** The order to send now, if any. */
  next(): TeachOrder | null {
    const lesson = this.lessons[0];
    if (lesson === undefined) return null;
    lesson.requests += 1;
    if (lesson.requests <= MOST_REQUESTS) return lesson.order;
    this.end(null);
    return this.next();
  }

  heard(body: ReplyBody): void {
    if (body.word === 'lim' || (body.word === 'no' && !NOT_AN_ANSWER.includes(body.code))) this.end(body);
  }

  /** Nothing more can be asked. */
  cutOff(): void {
    while (this.lessons.length > 0) this.end(null);
  }

  private end(answer: TeachAnswer): void {
    this.lessons.shift()?.answered(answer);
  }
}
