import { soak } from './report';
import { crashRounds } from './run/crash-rounds';
import { countOf } from './run/real-night';

/**
 * PostgreSQL stops at once, as in a power cut, at some instant of a run, and comes back seconds later: 50 times, or 500 as the second figure
 * (`--rounds N`). Every third time somebody holds over HTTP meanwhile. At the end the run is stopped over HTTP without a database, and the
 * server is killed before it is back.
 */
const FIRST = 50;
const SECOND = 500;

soak('r4', async (args) => {
  const count = countOf(args, { first: FIRST, second: SECOND });
  const { violations, answeredMs, told } = await crashRounds('crash', count);
  return {
    ok: violations.length === 0,
    rounds: count,
    events: told.size,
    askedWithoutDatabase: answeredMs.length,
    slowestAnswerMs: Math.round(Math.max(...answeredMs)),
    violations,
  };
});
