import { isSealed } from '../interfaces/secret-box';
import type { Services } from './services';

/** A password that the server gives to a broker or a camera, sealed in the database. */

export interface Keeper {
  of: 'broker' | 'camera';
  labId: string;
  rigId: string;
}

const placeOf = ({ of, labId, rigId }: Keeper) => `${of} of rig ${rigId} in lab ${labId}`;

/** As it may lie in the database. */
export const sealedPassword = ({ secrets }: Pick<Services, 'secrets'>, keeper: Keeper, password: string | null): string | null =>
  password === null ? null : secrets.seal(password, placeOf(keeper));

/**
 * As it was given; undefined where this server cannot read it. One that an older version left readable is handed to `keep`, sealed, to be put in its
 * place.
 */
export async function readPassword(
  { secrets }: Pick<Services, 'secrets'>,
  kept: Keeper & { password: string | null },
  keep: (sealed: string) => Promise<void>,
): Promise<string | null | undefined> {
  const { password } = kept;
  if (password === null) return null;
  if (isSealed(password)) return secrets.open(password, placeOf(kept)) ?? undefined;
  await keep(secrets.seal(password, placeOf(kept)));
  return password;
}
