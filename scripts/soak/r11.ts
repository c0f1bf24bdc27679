import { honestNight, nightKinds, type HonestNight } from './honesty/honest-night';
import { soak } from './report';

/**
 * Whether the uncertainty says what it claims: over 200 nights of each kind (2,000 as the second figure) whose geometry, drift, gaps, outliers and clock
 * nobody knows, the true G lies in the 95 % interval in 181 to 199 of 200, and |mean of (G − true G)/u| stays below 0.22. `--nights N` looks at N of them, `--from SEED` at others than the first; both keep nothing, and from 200 on they are judged too.
 */
const FIRST = 200;
const SECOND = 2_000;
const SHARE = { least: 181 / 200, most: 199 / 200 };
const GREATEST_MEAN = 0.22;

soak('r11', (args) => {
  const given = (option: string) => (args.includes(option) ? Number(args[args.indexOf(option) + 1]) : null);
  const nights = given('--nights') ?? (args.includes('--second') ? SECOND : FIRST);
  const from = given('--from') ?? 1;
  const kinds = Object.entries(nightKinds).map(([kind, of]) => {
    const found = Array.from({ length: nights }, (_, k) => honestNight(from + k, of));
    return { kind, ...of, ...figuresOf(found) };
  });
  const ok = kinds.every(
    ({ inside, meanPull }) => inside >= SHARE.least * nights && inside <= SHARE.most * nights && Math.abs(meanPull) < GREATEST_MEAN,
  );
  return { ok: ok || nights < FIRST, nights, from, kinds };
});

function figuresOf(found: readonly HonestNight[]) {
  const mean = (values: readonly number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;
  return {
    inside: found.filter((night) => night.inside).length,
    meanPull: mean(found.map(({ pull }) => pull)),
    rmsPull: Math.sqrt(mean(found.map(({ pull }) => pull * pull))),
    offsets: found.filter(({ result }) => result.alignment?.clockOffset_s != null).length,
    /** Share of u(G)² that near minus far makes. */
    reversalShare: mean(found.map(({ result }) => result.budget?.find(({ input }) => input === 'reversal_rad')?.share ?? NaN)),
  };
}
