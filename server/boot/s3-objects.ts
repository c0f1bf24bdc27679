import { Readable } from 'node:stream';
import type { S3Client } from '@aws-sdk/client-s3';
import { MissingObjectError, type ObjectFacts, type ObjectStore } from '../interfaces/object-store';
import type { S3Place } from '../interfaces/server-config';

const connectMs = 5_000;
/** A connection that says nothing for so long is given up. */
const silentMs = 30_000;

/** Failures are told by whoever asked. */
const silent = { debug: nothing, info: nothing, warn: nothing, error: nothing };
function nothing(): void {
  return undefined;
}

/** Loaded by servers that use it alone: it costs as much of a start as all else. */
const sdk = () => import('@aws-sdk/client-s3');

/** Objects of a bucket of S3, or of any server that speaks like it. The server compares what it got with the SHA-256. */
export class S3Objects implements ObjectStore {
  private opened: Promise<S3Client> | null = null;

  constructor(private readonly place: S3Place) {}

  async put(name: string, source: AsyncIterable<Uint8Array>, { bytes, sha256 }: ObjectFacts): Promise<void> {
    const { PutObjectCommand } = await sdk();
    const client = await this.client();
    const body = Readable.from(exactly(source, { name, bytes }), { objectMode: false });
    const broken = new AbortController();
    // Nobody else listens to a source that breaks off.
    body.on('error', (error) => broken.abort(error));
    const object = {
      ...{ Bucket: this.place.bucket, Key: this.keyOf(name), Body: body, ContentLength: bytes },
      ...{ ContentType: 'application/octet-stream', ChecksumSHA256: Buffer.from(sha256, 'hex').toString('base64') },
    };
    await client.send(new PutObjectCommand(object), { abortSignal: broken.signal }).catch((error: unknown) => {
      throw broken.signal.aborted ? broken.signal.reason : error;
    });
  }

  async *read(name: string): AsyncGenerator<Uint8Array> {
    const { GetObjectCommand, NoSuchKey } = await sdk();
    const client = await this.client();
    const answer = await client.send(new GetObjectCommand({ Bucket: this.place.bucket, Key: this.keyOf(name) })).catch((error: unknown) => {
      throw error instanceof NoSuchKey ? new MissingObjectError(name) : error;
    });
    yield* answer.Body as Readable as AsyncIterable<Buffer>;
  }

  async remove(name: string): Promise<void> {
    const { DeleteObjectCommand } = await sdk();
    const client = await this.client();
    await client.send(new DeleteObjectCommand({ Bucket: this.place.bucket, Key: this.keyOf(name) }));
  }

  freeBytes(): Promise<null> {
    return Promise.resolve(null);
  }

  close(): void {
    void this.opened?.then((client) => client.destroy());
    this.opened = null;
  }

  private readonly keyOf = (name: string) => `${this.place.prefix}${name}`;

  private client(): Promise<S3Client> {
    this.opened ??= this.open();
    return this.opened;
  }

  private async open(): Promise<S3Client> {
    const { S3Client } = await sdk();
    const { region, endpoint, keyId, secret } = this.place;
    return new S3Client({
      region,
      credentials: { accessKeyId: keyId, secretAccessKey: secret },
      // Servers other than Amazon's know the bucket by the path.
      ...(endpoint === null ? {} : { endpoint, forcePathStyle: true }),
      requestHandler: { connectionTimeout: connectMs, socketTimeout: silentMs },
      logger: silent,
      // Ours is the digest; other servers do not know those that are added otherwise, and some keep them as a part of the file.
      requestChecksumCalculation: 'WHEN_REQUIRED',
      responseChecksumValidation: 'WHEN_REQUIRED',
    });
  }
}

/** A body that is shorter than was said would be waited for. */
async function* exactly(source: AsyncIterable<Uint8Array>, { name, bytes }: { name: string; bytes: number }): AsyncGenerator<Uint8Array> {
  let length = 0;
  for await (const chunk of source) {
    length += chunk.length;
    if (length > bytes) break;
    yield chunk;
  }
  if (length !== bytes) throw new Error(`not ${String(bytes)} bytes came for ${name}`);
}
