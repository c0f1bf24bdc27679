import { createHash } from 'node:crypto';
import { appendFileSync, existsSync, mkdtempSync, readdirSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { FolderObjects } from '@/server/boot/folder-objects';
import { S3Objects } from '@/server/boot/s3-objects';
import { unspoilt } from '@/server/ingest/unspoilt';
import { MissingObjectError, SpoiltObjectError, type ObjectStore } from '@/server/interfaces/object-store';
import { FakeS3 } from '@/tests/support/fake-s3';

/** One contract of both stores: a folder, and S3 by its own SDK against a server in this process. */

const folder = mkdtempSync(join(tmpdir(), 'evenfall-objects-'));
const fake = new FakeS3();
let s3: S3Objects;
beforeAll(async () => {
  const place = { bucket: 'nights', region: 'us-east-1', prefix: 'lab/', keyId: fake.keyId, secret: 'test-secret' };
  s3 = new S3Objects({ ...place, endpoint: await fake.listen() });
});
afterAll(async () => {
  s3.close();
  await fake.close();
  rmSync(folder, { recursive: true });
});

/** Every byte, and more than one chunk of any stream. */
const bytes = Buffer.from(Array.from({ length: 300_000 }, (_, index) => (index * 7919) % 256));
const sha256 = createHash('sha256').update(bytes).digest('hex');
const facts = { bytes: bytes.length, sha256 };

async function* inChunks(all: Buffer, fails = false): AsyncGenerator<Uint8Array> {
  for (let from = 0; from < all.length; from += 65_000) {
    if (fails && from > 130_000) throw new Error('the source broke off');
    yield all.subarray(from, from + 65_000);
  }
}

async function all(source: AsyncIterable<Uint8Array>): Promise<Buffer> {
  const chunks: Uint8Array[] = [];
  for await (const chunk of source) chunks.push(chunk);
  return Buffer.concat(chunks);
}

describe.each<[string, () => ObjectStore]>([
  ['a folder', () => new FolderObjects(folder)],
  ['S3', () => s3],
])('%s', (_, store) => {
  test('gives back the bytes that were put', async () => {
    await store().put('imports/one/a-1', inChunks(bytes), facts);
    expect((await all(store().read('imports/one/a-1'))).equals(bytes)).toBe(true);
    expect((await all(unspoilt(store().read('imports/one/a-1'), { name: 'a-1', ...facts }))).equals(bytes)).toBe(true);
  });

  test('keeps an empty file, and one in place of another', async () => {
    const empty = { bytes: 0, sha256: createHash('sha256').digest('hex') };
    await store().put('imports/one/b', inChunks(bytes), facts);
    await store().put('imports/one/b', inChunks(Buffer.alloc(0)), empty);
    expect((await all(store().read('imports/one/b'))).length).toBe(0);
  });

  test('keeps nothing of a source that breaks off or is shorter than was said', async () => {
    await expect(store().put('imports/one/c', inChunks(bytes, true), facts)).rejects.toThrow('the source broke off');
    await expect(all(store().read('imports/one/c'))).rejects.toThrow(MissingObjectError);
    await expect(store().put('imports/one/d', inChunks(bytes.subarray(1)), facts)).rejects.toThrow();
    await expect(all(store().read('imports/one/d'))).rejects.toThrow(MissingObjectError);
  }, 20_000);

  test('has no more what was removed; to remove it again does no harm', async () => {
    await store().put('imports/one/e', inChunks(bytes), facts);
    await store().remove('imports/one/e');
    await store().remove('imports/one/e');
    await expect(all(store().read('imports/one/e'))).rejects.toThrow(MissingObjectError);
  });
});

test('the folder is for its owner alone, and no name leads out of it', async () => {
  const store = new FolderObjects(folder);
  await store.put('imports/two/a', inChunks(bytes), facts);
  expect(statSync(join(folder, 'imports/two/a')).mode & 0o777).toBe(0o600);
  expect(statSync(join(folder, 'imports')).mode & 0o777).toBe(0o700);
  expect(readdirSync(join(folder, 'imports/one')).filter((name) => name.endsWith('.part'))).toEqual([]);
  for (const name of ['../a', 'imports/../../a', '/a', 'imports//a', '.hidden', ''])
    await expect(store.put(name, inChunks(bytes), facts)).rejects.toThrow('is no name of an object');
  expect(existsSync(join(folder, '..', 'a'))).toBe(false);
  expect(await store.freeBytes()).toBeGreaterThan(0);
});

test('what was changed in the store is found out before its last piece', async () => {
  const store = new FolderObjects(folder);
  await store.put('imports/three/a', inChunks(bytes), facts);
  appendFileSync(join(folder, 'imports/three/a'), 'x');
  let seen = 0;
  const read = async () => {
    for await (const piece of unspoilt(store.read('imports/three/a'), { name: 'a', ...facts })) seen += piece.length;
  };
  await expect(read()).rejects.toThrow(SpoiltObjectError);
  expect(seen).toBeLessThan(bytes.length);
});

test('objects of S3 lie in the bucket under the prefix; one that refuses says so', async () => {
  await s3.put('imports/four/a', inChunks(bytes), facts);
  expect([...fake.kept.keys()]).toContain('/nights/lab/imports/four/a');
  fake.refusing = 503;
  await expect(s3.put('imports/four/b', inChunks(bytes), facts)).rejects.toThrow();
  await expect(all(s3.read('imports/four/a'))).rejects.toThrow();
  fake.refusing = null;
}, 20_000);
