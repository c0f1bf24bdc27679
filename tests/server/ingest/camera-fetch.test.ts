import { createCameraPort } from '@/server/ingest/camera-fetch';
import { NoPicture } from '@/server/interfaces/camera';
import { jpegOf, LoopbackCamera } from '@/tests/support/camera-on-loopback';

let camera: LoopbackCamera;
beforeEach(async () => {
  camera = await LoopbackCamera.start();
});
afterEach(() => camera.stop());

const bare = { userName: null, password: null };
const take = (
  change: { address?: string; userName?: string; password?: string; hosts?: string[]; timeoutMs?: number; nowUtcMs?: () => number } = {},
) => {
  const { hosts = [camera.host], timeoutMs = 5_000, nowUtcMs = () => 1_000_000, ...place } = change;
  return createCameraPort({ hosts, nowUtcMs, timeoutMs }).take({ address: camera.address, ...bare, ...place });
};
async function reasonOf(taking: Promise<unknown>): Promise<string> {
  try {
    await taking;
  } catch (error) {
    if (error instanceof NoPicture) return error.message;
    throw error;
  }
  throw new Error('a picture came');
}
const answers = (type: string | null, body: string | Buffer, status = 200) => {
  camera.answer = (_, res) => res.writeHead(status, type === null ? {} : { 'Content-Type': type }).end(body);
};
const streams = (...parts: (string | Buffer)[]) => {
  camera.answer = (_, res) => {
    res.writeHead(200, { 'Content-Type': 'multipart/x-mixed-replace; boundary="--frame"' });
    for (const part of parts) res.write(part);
  };
};
const pictures = { first: jpegOf('first'), second: jpegOf('second') };

test('a snapshot is taken with the middle of question and answer as its time and a rectangular u', async () => {
  const stamps = [10_000, 12_000];
  const picture = await take({ nowUtcMs: () => stamps.shift() ?? 0 });
  expect(Buffer.from(picture.bytes)).toEqual(jpegOf('a picture'));
  expect(picture).toMatchObject({ type: 'image/jpeg', takenUtcMs: 11_000 });
  // JCGM 100:2008, 4.3.7: half-width over the root of three.
  expect(picture.uTakenS).toBeCloseTo(1 / Math.sqrt(3), 12);
});

test('a name and a password go to the camera as Basic (RFC 7617), and a word is said where they are wrong', async () => {
  camera.answer = (req, res) => {
    const right = req.headers.authorization === `Basic ${Buffer.from('lamp:shut-the-box').toString('base64')}`;
    if (right) res.writeHead(200, { 'Content-Type': 'image/jpeg' }).end(pictures.first);
    else res.writeHead(401, { 'WWW-Authenticate': 'Basic realm="camera"' }).end();
  };
  expect((await take({ userName: 'lamp', password: 'shut-the-box' })).type).toBe('image/jpeg');
  const wrong = await reasonOf(take({ userName: 'lamp', password: 'open' }));
  expect(wrong).toMatch(/401: it asks for a name and a password/);
  expect(wrong).not.toContain('open');
});

test('of an MJPEG stream the first whole picture is taken and the stream is let go', async () => {
  const head = (picture: Buffer) => `--frame\r\nContent-Type: image/jpeg\r\nContent-Length: ${String(picture.length)}\r\n\r\n`;
  streams(head(pictures.first), pictures.first.subarray(0, 5), pictures.first.subarray(5), '\r\n', head(pictures.second), pictures.second);
  expect(Buffer.from((await take()).bytes)).toEqual(pictures.first);
  await new Promise<void>((resolve) => {
    const { socket } = camera.asked[0] as { socket: { destroyed: boolean; once(event: 'close', then: () => void): void } };
    if (socket.destroyed) resolve();
    else socket.once('close', resolve);
  });
});

test('parts without a length end at the next boundary', async () => {
  streams('\r\n--frame\r\nContent-type: image/jpeg\r\n\r\n', pictures.first, '\r\n--frame\r\nContent-type: image/jpeg\r\n\r\n');
  expect(Buffer.from((await take()).bytes)).toEqual(pictures.first);
});

test('a redirect is not followed, wherever it leads', async () => {
  camera.answer = (_, res) => res.writeHead(302, { Location: '/elsewhere.jpg' }).end();
  expect(await reasonOf(take())).toMatch(/302, a redirect to another address; that is not followed/);
  expect(camera.asked.map(({ url }) => url)).toEqual(['/picture.jpg']);
});

test.each<[string, string | null, string | Buffer, number, RegExp]>([
  [
    'a page for people',
    'text/html; charset=utf-8',
    '<!doctype html><title>Camera</title>',
    200,
    /a page for people .*Give the address of the picture/,
  ],
  ['a page that calls itself a picture', 'image/jpeg', '<!doctype html>', 200, /no whole JPEG or PNG, whatever the camera calls it/],
  ['a picture that was cut off', 'image/jpeg', jpegOf('x').subarray(0, -2), 200, /no whole JPEG or PNG/],
  ['no content type', null, jpegOf('x'), 200, /without a content type; image\/jpeg, image\/png or multipart/],
  ['a film', 'video/mp4', 'x', 200, /answered video\/mp4/],
  ['that it is not there', 'text/plain', 'x', 404, /answered 404 where 200 and a picture are right/],
  ['a stream without a boundary', 'multipart/x-mixed-replace', 'x', 200, /does not name the boundary/],
  [
    'a stream of something else',
    'multipart/x-mixed-replace; boundary=b',
    '--b\r\nContent-Type: text/plain\r\n\r\nx',
    200,
    /text\/plain instead of image\/jpeg/,
  ],
  [
    'a stream that ends',
    'multipart/x-mixed-replace; boundary=b',
    '--b\r\nContent-Type: image/jpeg\r\n\r\nx',
    200,
    /ended before a picture was whole/,
  ],
])('where it answers %s it is said what and what would be right', async (_, type, body, status, words) => {
  answers(type, body, status);
  expect(await reasonOf(take())).toMatch(words);
});

/** Writes for ever, as fast as it is read; tells how much was written when the other side went. */
function endless(type: string, head = ''): Promise<number> {
  return new Promise((resolve) => {
    camera.answer = (_, res) => {
      let bytes = 0;
      res.writeHead(200, { 'Content-Type': type });
      res.write(head);
      const block = Buffer.alloc(65_536, 1);
      const more = () => {
        while (!res.destroyed && res.write(block)) bytes += block.length;
      };
      res.on('drain', more);
      res.on('close', () => resolve(bytes));
      more();
    };
  });
}

test.each([
  ['picture', 'image/jpeg', ''],
  ['part of a stream', 'multipart/x-mixed-replace; boundary=b', '--b\r\nContent-Type: image/jpeg\r\n\r\n'],
])('a %s without an end is left at 1 MiB', async (_, type, head) => {
  const written = endless(type, head);
  expect(await reasonOf(take())).toMatch(/more than 1 MiB/);
  // What is on its way in buffers of the system comes on top.
  expect(await written).toBeLessThan(16 * 1_048_576);
});

test('a picture that says itself to be too large is not read at all', async () => {
  camera.answer = (_, res) => {
    res.writeHead(200, { 'Content-Type': 'image/png', 'Content-Length': 50_000_000 });
    res.flushHeaders();
  };
  expect(await reasonOf(take())).toMatch(/more than 1 MiB\. Set it to a smaller picture/);
});

test.each([
  ['never answers', () => undefined],
  [
    'stops in the middle',
    (_: unknown, res: { writeHead(status: number, headers: object): { write(part: string): void } }) =>
      res.writeHead(200, { 'Content-Type': 'image/jpeg' }).write('x'),
  ],
])('one that %s is given up in time', async (_, answer) => {
  camera.answer = answer as LoopbackCamera['answer'];
  expect(await reasonOf(take({ timeoutMs: 150 }))).toBe('no whole picture came within 0.15 s');
});

test('one that breaks off, and one that is not there, are told apart', async () => {
  camera.answer = (_, res) => void res.destroy();
  expect(await reasonOf(take())).toBe('it broke off before the picture was whole');
  const gone = await LoopbackCamera.start();
  await gone.stop();
  expect(await reasonOf(take({ address: gone.address, hosts: [gone.host] }))).toBe('nothing listens at this address');
});

test('only hosts that the configuration names are asked, port and all, also on the own network', async () => {
  expect(await reasonOf(take({ hosts: [] }))).toMatch(
    /is not among the hosts that cameras may be at: none so far\. Whoever runs the server/,
  );
  expect(await reasonOf(take({ hosts: ['127.0.0.1:1', 'camera.lab:80'] }))).toContain('127.0.0.1:1, camera.lab:80');
  // The same machine by another name is another host.
  expect(await reasonOf(take({ address: camera.address.replace('127.0.0.1', 'localhost') }))).toMatch(/^localhost:\d+ is not among/);
  expect(await reasonOf(take({ address: 'http://[::1' }))).toMatch(/this is no address/);
  expect(camera.asked).toEqual([]);
});

test('without a port an address means 80, and 443 under https', async () => {
  expect(await reasonOf(take({ address: 'http://camera.lab/x' }))).toMatch(/^camera\.lab:80 is not/);
  expect(await reasonOf(take({ address: 'https://camera.lab/x' }))).toMatch(/^camera\.lab:443 is not/);
});
