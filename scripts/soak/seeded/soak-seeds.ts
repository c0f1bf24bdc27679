import { soak } from '../report';
import { keepFailingSeed } from './failing-seeds';
import { trySeed, type SeededKinds } from './try-seeds';

const KEPT_VIOLATIONS = 20;
const TOLD_EVERY = 1_000;

/** Which seeds of a kind are tried. */
interface Choice {
  kind: string;
  from: number;
  count: number;
}

/**
 * A soak of seeded cases: tries all kinds, each from seed 1 on. `--kind NAME` chooses one, `--seed N` tries one seed again, `--from N` and `--seeds N` others, `--second`
 * the greater figure. The seeds are told before they begin; one that fails is kept in `tests/fixtures/failing-seeds.json`. What else is to be found out when all are tried
 * comes from `then`.
 */
export function soakSeeds(
  name: string,
  kinds: SeededKinds,
  then: () => Promise<{ violations: string[]; [figure: string]: unknown }> = async () => ({ violations: [] }),
): void {
  soak(name, async (args) => {
    const violations: string[] = [];
    const tried: Record<string, number> = {};
    const failed: Record<string, number> = {};
    const choices = choicesOf(kinds, args);
    for (const { kind, from, count } of choices) {
      const attempt = kinds[kind]?.attempt ?? (() => [`there is no kind ${kind}`]);
      process.stderr.write(`${name}, ${kind}: seeds ${from} to ${from + count - 1}\n`);
      for (let seed = from; seed < from + count; seed += 1) {
        const wrong = await trySeed(attempt, seed);
        tried[kind] = (tried[kind] ?? 0) + 1;
        if (wrong.length > 0) {
          failed[kind] = (failed[kind] ?? 0) + 1;
          process.stderr.write(`${name}, ${kind}, seed ${seed} failed: ${wrong.join('\n  ')}\n`);
          keepFailingSeed({ soak: name, kind, seed });
        }
        violations.push(...wrong.slice(0, Math.max(0, KEPT_VIOLATIONS - violations.length)));
        if (tried[kind] % TOLD_EVERY === 0) process.stderr.write(`${tried[kind]} tried, ${failed[kind] ?? 0} failed\n`);
      }
    }
    const { violations: more, ...figures } = await then();
    violations.push(...more);
    return { ok: violations.length === 0, tried, failed, ...figures, violations };
  });
}

const valueOf = (args: readonly string[], name: string) => (args.includes(name) ? args[args.indexOf(name) + 1] : undefined);
const numberOf = (args: readonly string[], name: string) => (args.includes(name) ? Number(valueOf(args, name)) : null);

function choicesOf(kinds: SeededKinds, args: readonly string[]): Choice[] {
  const only = valueOf(args, '--kind');
  const seed = numberOf(args, '--seed');
  const from = seed ?? numberOf(args, '--from') ?? 1;
  const chosen = only === undefined ? Object.keys(kinds) : [only];
  const strange = chosen.find((kind) => kinds[kind] === undefined);
  if (strange !== undefined) throw new Error(`no kind called ${strange}; there are: ${Object.keys(kinds).join(', ')}`);
  return chosen.map((kind) => {
    const { first = 0, second = 0 } = kinds[kind] ?? {};
    const whole = args.includes('--second') ? second : first;
    return { kind, from, count: seed === null ? (numberOf(args, '--seeds') ?? whole) : 1 };
  });
}
