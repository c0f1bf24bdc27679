import type { BuiltServer } from '@/server/boot/build-server';

let port = 0;

/** Lets a server listen where the one before it did, so that a browser which is used again knows the program already. Returns the address. */
export async function listensAgain(built: BuiltServer): Promise<string> {
  const { config } = built.services;
  config.port = port;
  const address = await built.listen().catch((taken: unknown) => {
    if (port === 0) throw taken;
    config.port = 0;
    return built.listen();
  });
  ({ port } = config);
  return address;
}
