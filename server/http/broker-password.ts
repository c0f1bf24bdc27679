import { sealPassword, type BrokerRecord } from '@/server/store/brokers';
import { isSealed } from '../interfaces/secret-box';
import type { Services } from './services';

const placeOf = ({ labId, rigId }: { labId: string; rigId: string }) => `broker of rig ${rigId} in lab ${labId}`;

/** As it may lie in the database. */
export const sealedPassword = (
  { secrets }: Pick<Services, 'secrets'>,
  rig: { labId: string; rigId: string },
  password: string | null,
): string | null => (password === null ? null : secrets.seal(password, placeOf(rig)));

/** As the broker is given it; undefined where this server cannot read it. One that an older version left readable is sealed. */
export async function readPassword(services: Services, broker: BrokerRecord): Promise<string | null | undefined> {
  const { password } = broker;
  if (password === null) return null;
  if (isSealed(password)) return services.secrets.open(password, placeOf(broker)) ?? undefined;
  await sealPassword(services.database.db, broker, services.secrets.seal(password, placeOf(broker)));
  return password;
}
