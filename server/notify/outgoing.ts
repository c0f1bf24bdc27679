import { lookup as lookUp } from 'node:dns/promises';
import { request as httpRequest } from 'node:http';
import { request as httpsRequest } from 'node:https';
import { BlockList, isIP } from 'node:net';
import { RefusedAddress, type OutgoingPort, type OutgoingRequest } from '../interfaces/outgoing';

const timeoutMs = 5_000;
const mostAnswerBytes = 65_536;

/** Networks that are no public address (RFC 6890 and its successors). */
const notPublic = new BlockList();
for (const [network, prefix] of [
  ...([
    ['0.0.0.0', 8],
    ['10.0.0.0', 8],
    ['100.64.0.0', 10],
    ['127.0.0.0', 8],
    ['169.254.0.0', 16],
    ['172.16.0.0', 12],
  ] as const),
  ...([
    ['192.0.0.0', 24],
    ['192.0.2.0', 24],
    ['192.88.99.0', 24],
    ['192.168.0.0', 16],
    ['198.18.0.0', 15],
    ['198.51.100.0', 24],
  ] as const),
  ...([
    ['203.0.113.0', 24],
    ['224.0.0.0', 4],
    ['240.0.0.0', 4],
  ] as const),
])
  notPublic.addSubnet(network, prefix, 'ipv4');
for (const [network, prefix] of [
  ...([
    ['::', 96],
    ['64:ff9b::', 96],
    ['64:ff9b:1::', 48],
    ['100::', 64],
    ['2001::', 23],
    ['2001:db8::', 32],
    ['2002::', 16],
  ] as const),
  ...([
    ['fc00::', 7],
    ['fe80::', 10],
    ['ff00::', 8],
  ] as const),
])
  notPublic.addSubnet(network, prefix, 'ipv6');

/** Whether an address can be reached over the internet and is nobody's inside. */
export const isPublicAddress = (address: string): boolean => {
  const family = isIP(address);
  return family !== 0 && !notPublic.check(address, family === 6 ? 'ipv6' : 'ipv4');
};

const bare = (host: string) => host.replace(/^\[(.*)\]$/, '$1');

/**
 * What can be seen of an address without asking anybody.
 * @throws RefusedAddress
 */
export function checkedUrl(text: string, privateHosts: readonly string[]): { url: URL; own: boolean } {
  if (!URL.canParse(text)) throw new RefusedAddress('This is no address. One that is right: https://watch.example/ping/4711');
  const url = new URL(text);
  const port = url.port === '' ? (url.protocol === 'https:' ? '443' : '80') : url.port;
  const own = privateHosts.includes(`${url.hostname}:${port}`);
  if (url.username !== '' || url.password !== '')
    throw new RefusedAddress('The address holds a name or a password before the host. Use one with a secret in its path instead.');
  if (url.protocol !== 'https:' && !(own && url.protocol === 'http:')) throw new RefusedAddress('The address must begin with https://.');
  if (!own && isIP(bare(url.hostname)) !== 0 && !isPublicAddress(bare(url.hostname))) throw inside(url);
  return { url, own };
}

const inside = ({ host }: URL) =>
  new RefusedAddress(
    `${host} lies in a private network. Only public addresses are used; whoever runs the server can allow a host of the own network (EVENFALL_PRIVATE_HOSTS).`,
  );

/** The address to connect to, looked up once, so that no second look-up can lead elsewhere. */
async function addressOf(url: URL, own: boolean): Promise<{ address: string; family: number }> {
  const found = await lookUp(bare(url.hostname), { all: true });
  const [first] = found;
  if (first === undefined) throw new Error(`${url.hostname} has no address`);
  if (!own && !found.every(({ address }) => isPublicAddress(address))) throw inside(url);
  return first;
}

/** Requests to addresses that people typed in or browsers handed over. */
export function createOutgoing(privateHosts: readonly string[]): OutgoingPort {
  return {
    send: async (wanted) => {
      const { url, own } = checkedUrl(wanted.url, privateHosts);
      const { status } = await exchange(url, await addressOf(url, own), wanted);
      if (status >= 300 && status < 400) throw new Error(`it answered ${String(status)}, a redirect; that is not followed`);
      return { status };
    },
  };
}

function exchange(
  url: URL,
  to: { address: string; family: number },
  { method, headers, body }: OutgoingRequest,
): Promise<{ status: number }> {
  const send = url.protocol === 'https:' ? httpsRequest : httpRequest;
  return new Promise((resolve, reject) => {
    const request = send(
      url,
      {
        method,
        headers: { 'User-Agent': 'Evenfall', 'Content-Length': String(body?.byteLength ?? 0), ...headers },
        signal: AbortSignal.timeout(timeoutMs),
        agent: false,
        lookup: (_host, options, done) => {
          if (options.all === true) done(null, [to]);
          else done(null, to.address, to.family);
        },
      },
      (response) => {
        let bytes = 0;
        response.on('data', (chunk: Buffer) => {
          bytes += chunk.length;
          if (bytes > mostAnswerBytes) response.destroy();
        });
        response.on('close', () => resolve({ status: response.statusCode ?? 0 }));
        response.on('error', () => undefined);
      },
    );
    request.on('error', (error) =>
      reject(error.name === 'TimeoutError' ? new Error(`no answer within ${String(timeoutMs / 1000)} s`) : error),
    );
    request.end(body ?? undefined);
  });
}
