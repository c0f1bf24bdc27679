import { randomBytes } from 'node:crypto';
import request from 'supertest';
import { demoIds } from '@/db/demo/seed';
import type { CameraView, FrameView } from '@/shared/contracts/cameras';
import type { StartCheck } from '@/shared/contracts/rigs';
import { jpegOf } from '@/tests/support/camera-on-loopback';
import { quickProtocol } from '@/tests/support/lab-server';
import { asBytes, cameraLabOfThisFile, camerasPath } from './camera-lab';

const at = cameraLabOfThisFile();

describe('a camera whose pictures are sent', () => {
  const push = (secret: string, body: Buffer, { type = 'image/jpeg', query = '' } = {}) =>
    request(at().lab.built.app)
      .post(`/api/camera-pictures${query}`)
      .set('Authorization', `Bearer ${secret}`)
      .set('Content-Type', type)
      .send(body);
  const make = async (name: string) =>
    (await at().add({ kind: 'pushed', name }).expect(201)).body as { camera: CameraView; secret: string };

  test('has a token that is shown once and can do nothing else', async () => {
    const { camera: made, secret } = await make('Hand held');
    await push(secret, jpegOf('one'), { query: '?ageS=3' }).expect(204);
    const view = await at().named('Hand held');
    // Between 3 s and 3.5 s before the request, by the sender's own word.
    expect(Date.parse(view?.takenAt ?? '')).toBeCloseTo(at().lab.clock.utcMs() - 3_250, -1);
    expect(JSON.stringify([view, (await at().lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`)).body])).not.toContain(secret);
    await request(at().lab.built.app).get(`/api${camerasPath}`).set('Authorization', `Bearer ${secret}`).expect(401);
    await request(at().lab.built.app)
      .post('/api/samples')
      .set('Authorization', `Bearer ${secret}`)
      .set('Content-Type', 'application/x-ndjson')
      .send('{"time_utc": "2031-02-14T20:00:00Z", "value": 1}')
      .expect(401);
    await at().remove(made.id);
    expect((await push(secret, jpegOf('two')).expect(401)).body.detail).toMatch(/No camera has this token, or it was removed/);
  });

  test('is named before a start where it is silent; a start is not kept back by it', async () => {
    const checked = async () => {
      const query = `protocolId=${demoIds.shortProtocol}&revision=1`;
      const { body } = await at().lab.as('viewer', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/start-checks?${query}`).expect(200);
      return (body as { checks: StartCheck[] }).checks.find(({ code }) => code === 'cameras');
    };
    expect(await checked()).toMatchObject({ state: 'pass', detail: 'The camera gives pictures, as far as it was asked.' });
    const { camera: made, secret } = await make('In the corner');
    expect(await checked()).toMatchObject({
      state: 'note',
      detail: 'In the corner has sent no picture yet. The run goes on without its frames.',
    });
    await push(secret, jpegOf('now')).expect(204);
    expect(await checked()).toMatchObject({ state: 'pass', detail: '2 cameras give pictures, as far as they were asked.' });
    await at().lab.advance(61_000);
    expect(await checked()).toMatchObject({ state: 'note', detail: expect.stringMatching(/^In the corner sent its last picture /) });
    await at().remove(made.id);
  });

  test('keeps the picture before where what comes is none, too large, of another kind or too often', async () => {
    const { camera: made, secret } = await make('Clumsy');
    await push(secret, jpegOf('good')).expect(204);
    expect((await push(secret, Buffer.from('<!doctype html>')).expect(422)).body.detail).toMatch(/no whole JPEG or PNG/);
    expect((await push(secret, randomBytes(1_048_577)).expect(413)).body.detail).toMatch(/at most 1 MiB/);
    expect((await push(secret, jpegOf('x'), { type: 'text/plain' }).expect(415)).body.code).toBe('wrong-content-type');
    expect((await push(secret, jpegOf('x'), { query: '?ageS=-1' }).expect(400)).body.code).toBe('invalid-input');
    for (let turn = 0; turn < 3; turn += 1) await push(secret, jpegOf('good')).expect(204);
    const flood = await push(secret, jpegOf('flood')).expect(429);
    expect(flood.headers['retry-after']).toBe('10');
    const picture = await at().lab.as('viewer', 'GET', `${camerasPath}/${made.id}/picture`).buffer(true).parse(asBytes).expect(200);
    expect(picture.body).toEqual(jpegOf('good'));
  });

  test('gives a moment the picture that came next, and a note where none came in time', async () => {
    const { secret } = await make('By the window');
    await push(secret, jpegOf('long before')).expect(204);
    const runId = await at().lab.run(
      quickProtocol({
        name: 'Sent',
        steps: [
          { kind: 'home' },
          { kind: 'mark', label: 'look', frame: true },
          { kind: 'dwell', for_s: 60 },
          { kind: 'mark', label: 'nobody', frame: true },
        ],
      }),
    );
    await at().until(async () => (await at().rowsOf(runId)).some(({ kind }) => kind === 'mark'));
    await at().lab.advance(3_000);
    await push(secret, jpegOf('in time')).expect(204);
    await at().lab.until(runId, 'finished');
    await at().lab.advance(15_000);
    const own = await at().framesOf(runId, 'By the window');
    expect(own).toMatchObject([
      { note: null, picture: { type: 'image/jpeg' } },
      { note: 'no picture of it came within 10 s', picture: null },
    ]);
    expect((await at().pictureOf(runId, own[0] as FrameView)).bytes).toEqual(jpegOf('in time'));
  });
});
