import { phoneFaults } from '@/scripts/soak/phone/faulty-network';
import { tryPhone } from '@/scripts/soak/phone/try-phone';

/** The phone's own client on a bad network and a clock that is invented: a slice of `npm run soak -- r8`. */

test.each(phoneFaults)(
  '%s: "Stopped" is never said too early, no resume moves late, no stop acts twice, the stream has no gap',
  async (fault) => {
    for (const seed of [1, 2]) expect(await tryPhone(fault, seed)).toEqual([]);
  },
);
