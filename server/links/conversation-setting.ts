import type { Clock } from '../interfaces/clock';
import type { ClockModel } from './clock-model';
import type { CommandBook } from './command-book';
import type { ControllerReport } from './controller-report';
import type { Lease } from './lease';
import type { LinkMetrics } from './link-metrics';
import type { LinkTelling } from './link-telling';
import type { Teaching } from './teaching';
import type { Wire } from './wire';

/** What a conversation with a controller works with. */
export interface ConversationSetting {
  clock: Clock;
  wire: Wire;
  book: CommandBook;
  telling: LinkTelling;
  model: ClockModel;
  metrics: LinkMetrics;
  teaching: Teaching;
  lease: Lease;
  report: ControllerReport;
  /** Everything is known that is needed to drive: once for each line and each start of the controller. */
  ready(sameBoot: boolean): void;
  /** This controller cannot be driven. */
  refused(why: string): void;
}
