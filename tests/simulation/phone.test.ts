import { phoneFaults } from '@/scripts/soak/phone/faulty-network';
import { tryPhone } from '@/scripts/soak/phone/try-phone';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** The phone's own client on a bad network and a clock that is invented: a slice of `npm run soak -- r8`. */

const EACH = 2;

test.each(phoneFaults)(
  '%s: "Stopped" is never said too early, no resume moves late, no stop acts twice, the stream has no gap',
  async (fault) => {
    expect(await tryFirst(EACH, (seed) => tryPhone(fault, seed))).toEqual([]);
  },
);
