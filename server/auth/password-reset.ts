import type { Transaction } from '../store/database';
import { askForPasswordChangedMail, askForPasswordResetMail } from '../store/mail-requests';
import { takePasswordReset } from '../store/password-resets';
import { normalEmail, setPasswordHash, userById } from '../store/people';
import type { AuthParts, Wait } from './auth-parts';
import { hashPassword, weaknessOf } from './passwords';
import { countTry, rates } from './rates';
import { auditInAllLabs } from './sign-in';

/** Asks for a reset mail; known and unknown addresses are treated alike up to the sending itself. */
export async function requestPasswordReset(
  parts: AuthParts,
  given: { email: string; ip: string; origin: string },
): Promise<{ kind: 'asked' } | Wait> {
  const email = normalEmail(given.email);
  const wait = await countTry(parts, [
    { rule: rates.resetAccount, subject: email },
    { rule: rates.resetAddress, subject: given.ip },
  ]);
  if (wait !== null) return wait;
  await askForPasswordResetMail(parts.db, { email, origin: given.origin }, parts.clock.utcMs());
  return { kind: 'asked' };
}

export type ResetOutcome = { kind: 'changed'; userId: string } | { kind: 'unknown-token' } | { kind: 'weak'; why: string } | Wait;

/** Undoes the use of a token whose new password is refused: the person may choose another with the same link. */
class WeakPassword extends Error {}

/** Sets a new password with a token of a mail and ends all sessions of the account. */
export async function completePasswordReset(
  parts: AuthParts,
  given: { token: string; password: string; ip: string },
): Promise<ResetOutcome> {
  const wait = await countTry(parts, [{ rule: rates.tokenAddress, subject: given.ip }]);
  if (wait !== null) return wait;
  const passwordHash = await hashPassword(given.password);
  try {
    const outcome = await parts.db.transaction((tx) => change(parts, { ...given, passwordHash }, tx));
    if (outcome.kind === 'changed') await parts.sessions.endAllOf(outcome.userId);
    return outcome;
  } catch (error) {
    if (error instanceof WeakPassword) return { kind: 'weak', why: error.message };
    throw error;
  }
}

async function change(
  parts: AuthParts,
  given: { token: string; password: string; passwordHash: string },
  tx: Transaction,
): Promise<ResetOutcome> {
  const nowUtcMs = parts.clock.utcMs();
  const userId = await takePasswordReset(tx, parts.sha256(given.token), nowUtcMs);
  const user = userId === null ? null : await userById(tx, userId);
  if (user === null) return { kind: 'unknown-token' };
  const weakness = weaknessOf(given.password, [user.name, user.email]);
  if (weakness !== null) throw new WeakPassword(weakness);
  await setPasswordHash(tx, user.id, given.passwordHash);
  await auditInAllLabs(tx, { user, kind: 'person.password-changed' }, parts);
  await askForPasswordChangedMail(tx, { userId: user.id, atUtcMs: nowUtcMs }, nowUtcMs);
  return { kind: 'changed', userId: user.id };
}
