import { runNight, type Night } from '@/scripts/soak/link/night';
import { checks } from '@/scripts/soak/link/checks';
import { serialFaults, situations, type Situation } from '@/scripts/soak/link/situations';
import { tryNight } from '@/scripts/soak/link/try-night';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** More of them by `EVENFALL_LINK_SEEDS`, and by `npm run soak -- r2 link`. */
const ON_THE_LINE = Number(process.env['EVENFALL_LINK_SEEDS'] ?? 200);
const AT_THE_MACHINE = Number(process.env['EVENFALL_LINK_SEEDS'] ?? 20);
const onTheLine: readonly string[] = [...serialFaults, 'merge', 'mixed'];
const seedsOf = ({ name }: Situation) => (onTheLine.includes(name) ? ON_THE_LINE : AT_THE_MACHINE);

test.each(situations.map((situation) => [situation.name, seedsOf(situation), situation] as const))(
  'nights with trouble "%s": nothing is done twice, moves where it must not, or goes untold (%d seeds)',
  async (_name, seeds, situation) => {
    expect(await tryFirst(seeds, (seed) => tryNight(situation, seed))).toEqual([]);
  },
  60_000,
);

test('the same seed gives the same night', async () => {
  const mixed = situations.find(({ name }) => name === 'mixed') as Situation;
  const [first, second] = [await runNight(mixed, 3), await runNight(mixed, 3)];
  expect(second).toEqual(first);
  expect(await runNight(mixed, 4)).not.toEqual(first);
});

describe('each checker finds a fault that is planted', () => {
  const refused = situations.find(({ name }) => name === 'refused') as Situation;
  const planted: [keyof typeof checks, (night: Night) => void, string][] = [
    [
      'eachOnce',
      ({ arrived, replies }) => {
        const renewed = arrived.find(({ request }) => request.order.word === 'renew')?.request;
        const answer = replies.find(({ reply }) => reply.session === renewed?.session && reply.number === renewed.number);
        if (answer !== undefined) replies.push({ ...answer, reply: { ...answer.reply, receivedUs: answer.reply.receivedUs + 1 } });
      },
      'was carried out twice',
    ],
    [
      'nothingSpoiltIsRead',
      ({ line: { written, arrived } }) => (written as Set<string>).delete(arrived.findLast((line) => line.startsWith('q ')) ?? ''),
      'and nobody wrote it',
    ],
    ['doneWhenAcknowledged', (night) => void night.replies.splice(0), 'had not acknowledged it'],
    ['doneWhenAcknowledged', (night) => void night.did.splice(0), 'had not ended it'],
  ];

  test.each(planted)('%s', async (name, plant, words) => {
    const night = await runNight(refused, 1);
    expect(checks[name]?.(night, refused)).toBeNull();
    plant(night);
    expect(checks[name]?.(night, refused)).toContain(words);
  });
});
