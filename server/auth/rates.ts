import { countUse, type RateRule } from '../store/rate-limits';
import type { AuthParts, Wait } from './auth-parts';

const minute = 60;
const hour = 3600;

/** How often somebody may try; per account they slow a guesser down, per address a guesser of many accounts. */
export const rates = {
  /** One address on one account: who mistypes. */
  signInPair: { name: 'sign-in-pair', limit: 10, windowS: 15 * minute },
  /** One account from everywhere. */
  signInAccount: { name: 'sign-in-account', limit: 100, windowS: hour },
  signInAddress: { name: 'sign-in-address', limit: 100, windowS: 15 * minute },
  resetAccount: { name: 'reset-account', limit: 5, windowS: hour },
  resetAddress: { name: 'reset-address', limit: 20, windowS: hour },
  tokenAddress: { name: 'token-address', limit: 60, windowS: 15 * minute },
  inviteLab: { name: 'invite-lab', limit: 50, windowS: hour },
} satisfies Record<string, RateRule>;

interface Use {
  rule: RateRule;
  subject: string;
}

/** Counts a try under each rule; the longest wait where one of them says no. Subjects are kept as hashes only. */
export async function countTry(
  { db, clock, sha256 }: Pick<AuthParts, 'db' | 'clock' | 'sha256'>,
  uses: readonly Use[],
): Promise<Wait | null> {
  const waits: number[] = [];
  for (const { rule, subject } of uses) {
    const seconds = await countUse(db, rule, { subject: sha256(subject), nowUtcMs: clock.utcMs() });
    if (seconds !== null) waits.push(seconds);
  }
  return waits.length === 0 ? null : { kind: 'wait', seconds: Math.max(...waits) };
}
