import { request as httpRequest, type IncomingMessage } from 'node:http';
import { request as httpsRequest } from 'node:https';
import { MOST_PICTURE_BYTES, pictureTypeOf, pictureTypes, type Picture } from '@/shared/camera/picture';
import { NoPicture, type CameraAddress, type CameraPort } from '../interfaces/camera';
import { firstPart } from './first-part';

interface FetchParts {
  /** `name:port` of every host that may be asked. */
  hosts: readonly string[];
  nowUtcMs(): number;
  /** Default 8 s. */
  timeoutMs?: number;
}

const usualTimeoutMs = 8_000;
const multipart = 'multipart/x-mixed-replace';

/** The host of an address with its port, as the configuration names hosts. */
export function hostOf(address: string): string {
  const url = new URL(address);
  return `${url.hostname}:${url.port === '' ? (url.protocol === 'https:' ? '443' : '80') : url.port}`;
}

/** Why a camera at this address is not asked; null where it may be. */
export function refusalOf(address: string, hosts: readonly string[]): string | null {
  if (!URL.canParse(address)) return 'this is no address. One that is right: http://camera.lab:80/picture.jpg';
  const host = hostOf(address);
  if (hosts.includes(host)) return null;
  const allowed = hosts.length === 0 ? 'none so far' : hosts.join(', ');
  return `${host} is not among the hosts that cameras may be at: ${allowed}. Whoever runs the server names them in EVENFALL_CAMERA_HOSTS`;
}

export function createCameraPort({ hosts, nowUtcMs, timeoutMs = usualTimeoutMs }: FetchParts): CameraPort {
  return {
    take: async (camera, signal) => {
      const refusal = refusalOf(camera.address, hosts);
      if (refusal !== null) throw new NoPicture(refusal);
      const askedUtcMs = nowUtcMs();
      const bytes = await fetched(camera, { timeoutMs, stop: signal ?? null });
      return stamped(bytes, askedUtcMs, nowUtcMs());
    },
  };
}

/** Taken at some time between question and answer: rectangular (JCGM 100:2008, 4.3.7). */
function stamped(bytes: Buffer, askedUtcMs: number, cameUtcMs: number): Picture {
  const type = pictureTypeOf(bytes);
  if (type === null) throw new NoPicture('what came is no whole JPEG or PNG, whatever the camera calls it');
  const halfS = Math.max(0, cameUtcMs - askedUtcMs) / 2000;
  return { bytes, type, takenUtcMs: askedUtcMs + 1000 * halfS, uTakenS: Math.max(0.001, halfS / Math.sqrt(3)) };
}

interface Wait {
  timeoutMs: number;
  stop: AbortSignal | null;
}

function fetched({ address, userName, password }: CameraAddress, wait: Wait): Promise<Buffer> {
  const url = new URL(address);
  const send = url.protocol === 'https:' ? httpsRequest : httpRequest;
  const signsIn = userName === null ? {} : { auth: `${userName}:${password ?? ''}` };
  return new Promise((resolve, reject) => {
    const options = {
      ...signsIn,
      headers: { 'User-Agent': 'Evenfall', Accept: [...pictureTypes, multipart].join(', ') },
      signal: AbortSignal.any([AbortSignal.timeout(wait.timeoutMs), ...(wait.stop === null ? [] : [wait.stop])]),
      agent: false,
    };
    const request = send(url, options, (response) => {
      pictureIn(response)
        .then(resolve, (error: unknown) => reject(worded(error, wait)))
        .finally(() => response.destroy());
    });
    request.on('error', (error) => reject(worded(error, wait)));
    request.end();
  });
}

async function pictureIn(response: IncomingMessage): Promise<Buffer> {
  const { statusCode = 0, headers } = response;
  const refusal = refusalOfStatus(statusCode, headers['www-authenticate'] ?? '');
  if (refusal !== null) throw new NoPicture(refusal);
  const [type = '', ...parameters] = (headers['content-type'] ?? '').split(';').map((part) => part.trim());
  const name = type.toLowerCase();
  if (name === multipart) return firstPart(response, boundaryOf(parameters));
  if (!(pictureTypes as readonly string[]).includes(name)) throw new NoPicture(wrongType(name));
  if (Number(headers['content-length'] ?? 0) > MOST_PICTURE_BYTES) throw tooLarge();
  const parts: Buffer[] = [];
  let size = 0;
  for await (const part of response as AsyncIterable<Buffer>) {
    size += part.length;
    if (size > MOST_PICTURE_BYTES) throw tooLarge();
    parts.push(part);
  }
  return Buffer.concat(parts);
}

function refusalOfStatus(status: number, challenge: string): string | null {
  if (status === 200) return null;
  if (status >= 300 && status < 400)
    return `it answered ${String(status)}, a redirect to another address; that is not followed. Give the address where the picture is`;
  if (status === 401 && /^digest/i.test(challenge) && !/basic/i.test(challenge))
    return 'it wants Digest sign-in, which is not spoken here. Set it to Basic sign-in, or to none for this picture';
  if (status === 401 || status === 403)
    return `it answered ${String(status)}: it asks for a name and a password, or refuses those it was given`;
  return `it answered ${String(status)} where 200 and a picture are right`;
}

const wrongType = (name: string) =>
  name === 'text/html'
    ? 'it answered a page for people (text/html), not a picture. Give the address of the picture or of the MJPEG stream itself'
    : `it answered ${name === '' ? 'without a content type' : name}; image/jpeg, image/png or ${multipart} are taken`;

const tooLarge = () =>
  new NoPicture(
    `its picture has more than ${String(MOST_PICTURE_BYTES / 1_048_576)} MiB. Set it to a smaller picture or a stronger compression`,
  );

function boundaryOf(parameters: readonly string[]): string {
  const found = parameters.find((parameter) => /^boundary=/i.test(parameter))?.slice('boundary='.length) ?? '';
  const boundary = found.replaceAll('"', '').replace(/^--/, '');
  if (boundary === '') throw new NoPicture('its stream does not name the boundary between pictures');
  return boundary;
}

/** What the system says, in words. */
function worded(error: unknown, { timeoutMs, stop }: Wait): NoPicture {
  if (error instanceof NoPicture) return error;
  if (stop?.aborted === true) return new NoPicture('the server was stopped before a picture came');
  const { name, code, message } = error as NodeJS.ErrnoException;
  if (name === 'TimeoutError' || name === 'AbortError' || code === 'ABORT_ERR')
    return new NoPicture(`no whole picture came within ${String(timeoutMs / 1000)} s`);
  if (code === 'ECONNREFUSED') return new NoPicture('nothing listens at this address');
  if (code === 'ENOTFOUND' || code === 'EAI_AGAIN') return new NoPicture('its host has no address in this network');
  if (code === 'ECONNRESET') return new NoPicture('it broke off before the picture was whole');
  return new NoPicture(`it could not be asked: ${message}`);
}
