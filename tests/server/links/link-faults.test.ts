import { runNight } from '@/scripts/soak/link/night';
import { situations, type Situation } from '@/scripts/soak/link/situations';
import { lineFaults } from '@/scripts/soak/link/faulty-line';
import { tryNight } from '@/scripts/soak/link/try-night';

/** More of them by `EVENFALL_LINK_SEEDS`, and by `npm run soak -- link`. */
const ON_THE_LINE = Number(process.env['EVENFALL_LINK_SEEDS'] ?? 200);
const AT_THE_MACHINE = Number(process.env['EVENFALL_LINK_SEEDS'] ?? 20);
const seedsOf = ({ name }: Situation) => (lineFaults.some((fault) => fault === name) ? ON_THE_LINE : AT_THE_MACHINE);

test.each(situations.map((situation) => [situation.name, seedsOf(situation), situation] as const))(
  'nights with trouble "%s": nothing is done twice, moves where it must not, or goes untold (%d seeds)',
  async (_name, seeds, situation) => {
    for (let seed = 1; seed <= seeds; seed += 1) expect(await tryNight(situation, seed)).toEqual([]);
  },
  60_000,
);

test('the same seed gives the same night', async () => {
  const mixed = situations.find(({ name }) => name === 'mixed') as Situation;
  const [first, second] = [await runNight(mixed, 3), await runNight(mixed, 3)];
  expect(second).toEqual(first);
  expect(await runNight(mixed, 4)).not.toEqual(first);
});
