import type { SeededKinds } from '../seeded/try-seeds';
import { runClockNight, wrongWithClocks } from './try-clocks';
import { tryPlan } from './try-plan';
import { tryRule } from './try-rule';

export const clockKinds: SeededKinds = {
  rule: { attempt: tryRule, first: 10_000, second: 1_000_000 },
  plan: { attempt: tryPlan, first: 10_000, second: 1_000_000 },
  run: { attempt: async (seed) => wrongWithClocks(await runClockNight(seed)), first: 1_000, second: 20_000 },
};
