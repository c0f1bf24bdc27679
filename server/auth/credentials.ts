import { normalEmail, userByEmail, type User } from '../store/people';
import { forgetUses, giveBackUse } from '../store/rate-limits';
import type { AuthParts, Wait } from './auth-parts';
import { verifyPassword } from './passwords';
import { countTry, rates } from './rates';

export type CredentialCheck = { kind: 'right'; user: User } | { kind: 'wrong' } | Wait;

/**
 * Whether e-mail and password belong together. Answer and time are the same whether the address is unknown, the
 * password wrong or the account a demo account on a server that is no demo. Only failures count against the limits.
 */
export async function checkCredentials(
  parts: Pick<AuthParts, 'db' | 'clock' | 'sha256' | 'demo'>,
  given: { email: string; password: string; ip: string },
): Promise<CredentialCheck> {
  const email = normalEmail(given.email);
  const pair = { rule: rates.signInPair, subject: `${email} ${given.ip}` };
  const account = { rule: rates.signInAccount, subject: email };
  const address = { rule: rates.signInAddress, subject: given.ip };
  const wait = await countTry(parts, [pair, account, address]);
  if (wait !== null) return wait;
  const user = await userByEmail(parts.db, email);
  const matches = await verifyPassword(user?.passwordHash ?? null, given.password);
  if (user === null || !matches || (user.demo && !parts.demo)) return { kind: 'wrong' };
  for (const { rule, subject } of [pair, account]) await forgetUses(parts.db, rule, parts.sha256(subject));
  // Not forgotten whole: else a guesser could clear the address by signing in to an account of his own.
  await giveBackUse(parts.db, address.rule, parts.sha256(address.subject));
  return { kind: 'right', user };
}
