import { act, fireEvent, render, screen } from '@testing-library/react';
import { useState } from 'react';
import { callOnce, serverNowIso, Unanswered } from '@/components/api';
import { resumeRun } from '@/shared/contracts/going-on';

/** A resume moves masses: it is sent once, counts for 5 s, and is never repeated by the page. */

const requests: RequestInit[] = [];
let answer: (init: RequestInit) => Promise<Response>;

function Resume() {
  const [said, setSaid] = useState('nothing');
  const resume = () => {
    const body = { tappedAt: serverNowIso(), reviewToken: 'token-1' };
    callOnce(resumeRun, { params: { labId: 'lab-1', runId: 'run-1' }, body }).then(
      () => setSaid('accepted'),
      (error: unknown) => setSaid(error instanceof Unanswered ? 'unanswered' : 'failed'),
    );
  };
  return (
    <button type="button" onClick={resume}>
      {said}
    </button>
  );
}

beforeEach(() => {
  jest.useFakeTimers({ now: Date.UTC(2031, 2, 14, 1, 0, 0) });
  requests.length = 0;
  globalThis.fetch = jest.fn((_: RequestInfo | URL, init: RequestInit = {}) => {
    requests.push(init);
    return answer(init);
  }) as typeof fetch;
});
afterEach(() => jest.useRealTimers());

async function tapAndWait(ms: number) {
  render(<Resume />);
  fireEvent.click(screen.getByRole('button'));
  await act(() => jest.advanceTimersByTimeAsync(ms));
  return screen.getByRole('button').textContent;
}

test('without a network nobody knows what became of it, and it is not sent again', async () => {
  answer = () => Promise.reject(new TypeError('network'));
  expect(await tapAndWait(60_000)).toBe('unanswered');
  expect(requests).toHaveLength(1);
});

test('an answer that does not come in 5 s is no longer waited for, and the request is called off', async () => {
  answer = (init) =>
    new Promise((_, reject) => init.signal?.addEventListener('abort', () => reject(new DOMException('aborted', 'AbortError'))));
  expect(await tapAndWait(4900)).toBe('nothing');
  await act(() => jest.advanceTimersByTimeAsync(200));
  expect(screen.getByRole('button').textContent).toBe('unanswered');
  expect(requests).toHaveLength(1);
  expect(requests[0]?.signal?.aborted).toBe(true);
});

test('carries the time of the tap and does not outlive the page', async () => {
  answer = () => Promise.reject(new TypeError('network'));
  await tapAndWait(10);
  expect(JSON.parse(String(requests[0]?.body))).toEqual({ tappedAt: '2031-03-14T01:00:00.000Z', reviewToken: 'token-1' });
  expect(requests[0]?.keepalive).toBe(false);
});
