import { camerasOf, frameAt } from '@/components/cameras/frame-at';
import { frameWords } from '@/components/cameras/camera-words';
import type { FrameView } from '@/shared/contracts/cameras';

const evening = Date.parse('2031-02-14T20:00:00Z');
const frame = (seconds: number, change: Partial<FrameView> = {}): FrameView => ({
  ...{ id: String(seconds), cameraId: 'c', camera: 'Above', seq: 2, moment: 'swing-began' },
  at: new Date(evening + 1000 * seconds).toISOString(),
  picture: {
    ...{ takenAt: new Date(evening + 1000 * seconds + 20).toISOString(), uTakenS: 0.1, type: 'image/png', bytes: 3, sha256: 'a' },
  },
  note: null,
  ...change,
});
const frames = [frame(10), frame(20, { camera: 'Door side' }), frame(30, { moment: 'swing-ended' })];

test('at a moment that frame stands which was the newest then, of each camera by itself', () => {
  const idAt = (camera: string, seconds: number) => frameAt(frames, camera, evening + 1000 * seconds)?.id ?? null;
  expect(camerasOf(frames)).toEqual(['Above', 'Door side']);
  expect([9.9, 10, 29, 30, 500].map((seconds) => idAt('Above', seconds))).toEqual([null, '10', '10', '30', '30']);
  expect([19, 25, 31].map((seconds) => idAt('Door side', seconds))).toEqual([null, '20', '20']);
});

test('a frame says what it shows and when, and how late it was taken where that can be seen', () => {
  expect(frameWords(frame(10), 'Europe/Zurich')).toBe('The swing began, 21:00:10, Above');
  const late = frame(10, {
    picture: { ...(frame(10).picture as NonNullable<FrameView['picture']>), takenAt: new Date(evening + 17_400).toISOString() },
  });
  expect(frameWords(late, 'Europe/Zurich')).toBe('The swing began, 21:00:10, Above, taken 7 s later');
});
