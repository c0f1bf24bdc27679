import { mkdtempSync, readdirSync, symlinkSync, truncateSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { zipSync } from 'fflate';
import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import { archiveLimits, readArchiveFiles, readZip, writeArchiveFolder, zipArchive } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { smallArchiveInput } from '../../support/small-archive';

const folder = () => mkdtempSync(join(tmpdir(), 'evenfall-archive-'));
const bytes = (text: string) => new TextEncoder().encode(text);
const files = buildArchive(smallArchiveInput(), sha256Hex);

describe('an archive on disk', () => {
  test('is the same from a ZIP, from a ZIP with a folder around it, and from a folder', () => {
    const path = join(folder(), 'run.zip');
    writeFileSync(path, zipArchive(files));
    const around = zipArchive(new Map([...files].map(([name, content]) => [`run-1/${name}`, content])));
    const asFolder = join(folder(), 'run');
    writeArchiveFolder(files, asFolder);
    for (const found of [readArchiveFiles(path), readZip(around), readArchiveFiles(asFolder)]) {
      expect([...found.keys()].sort()).toEqual([...files.keys()].sort());
      expect(readArchive(found, sha256Hex).warnings).toEqual([]);
    }
  });

  test('gives the same ZIP, byte for byte, from the same files', () => {
    expect(Buffer.from(zipArchive(files)).equals(Buffer.from(zipArchive(new Map(files))))).toBe(true);
  });

  test('is not written into a folder that holds something', () => {
    const full = folder();
    writeFileSync(join(full, 'note.txt'), 'mine');
    expect(() => writeArchiveFolder(files, full)).toThrow('is not an empty folder');
    expect(readdirSync(full)).toEqual(['note.txt']);
  });

  test('that is not there, or is no ZIP, is refused in words', () => {
    expect(() => readArchiveFiles('/nowhere/run.zip')).toThrow('there is no file or folder /nowhere/run.zip');
    expect(() => readZip(bytes('not a zip at all'))).toThrow('not a readable ZIP');
  });

  test('that the system does not let be read is refused in words', () => {
    // Nothing is mapped at the first address of a process, so reading there is an error, also for root.
    expect(() => readArchiveFiles('/proc/self/mem')).toThrow(/^\/proc\/self\/mem cannot be read: EIO/);
  });

  test('that is larger than can be held is refused before it is read', () => {
    const path = join(folder(), 'night.zip');
    writeFileSync(path, '');
    truncateSync(path, archiveLimits.bytes + 1);
    expect(() => readArchiveFiles(path)).toThrow(`${path} holds more than ${archiveLimits.bytes} bytes`);
  });
});

describe('hostile archives', () => {
  test.each(['../evil.txt', '/etc/evil', 'a/../../evil', 'C:/evil', 'a\\..\\evil'])('a path like %s is refused', (name) => {
    expect(() => readZip(zipSync({ [name]: bytes('x') }))).toThrow('leads out of the archive');
  });

  test('a ZIP that would fill the memory is refused before it is unpacked', () => {
    const bomb = zipSync({ 'zeros.bin': new Uint8Array(20_000_000) }, { level: 9 });
    expect(bomb.length).toBeLessThan(50_000);
    expect(() => readZip(bomb)).toThrow('refused as a ZIP bomb');
    expect(() => readZip(bomb, { ...archiveLimits, bytes: 1000 })).toThrow('more than 1000 bytes');
    expect(() => readZip(zipArchive(files), { ...archiveLimits, files: 2 })).toThrow('more than 2 files');
  });

  test('a ZIP that lies about a size yields no more than it says', () => {
    const honest = zipSync({ 'a.txt': new Uint8Array(1000).fill(65) });
    const lying = Buffer.from(honest);
    for (let at = 0; at + 4 <= lying.length; at += 1) if (lying.readUInt32LE(at) === 1000) lying.writeUInt32LE(10, at);
    expect(readZip(lying).get('a.txt')?.length).toBe(10);
  });

  test('a link that leads out of the folder is refused', () => {
    const secret = join(folder(), 'secret.json');
    writeFileSync(secret, '{}');
    const inside = folder();
    writeFileSync(join(inside, 'datapackage.json'), JSON.stringify({ resources: [{ path: 'rig.json' }] }));
    symlinkSync(secret, join(inside, 'rig.json'));
    expect(() => readArchiveFiles(inside)).toThrow('rig.json: a link leads out of the archive');
  });
});
