import { NotYetError } from '@/shared/lib/not-yet-error';
import type { ByteLineFactory } from '../interfaces/byte-line';

export function serialFactory(path: string, _baudRate: number): ByteLineFactory {
  throw new NotYetError(`${path} cannot be opened yet.`);
}
export async function assertPseudoTerminal(path: string): Promise<void> {
  throw new NotYetError(`${path} cannot be opened yet.`);
}
