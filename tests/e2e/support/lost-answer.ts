import type { Hand } from './hand';

/** The next such command of the page arrives at the server, and its answer is lost on the way back. */
export async function losesAnswerOf({ context, page }: Hand, urlPattern: string): Promise<void> {
  const session = await context.newCDPSession(page);
  let lost = false;
  session.on('Fetch.requestPaused', ({ requestId, request }) => {
    const isIt = !lost && request.method === 'POST';
    lost ||= isIt;
    void (isIt
      ? session.send('Fetch.failRequest', { requestId, errorReason: 'ConnectionReset' })
      : session.send('Fetch.continueRequest', { requestId }));
  });
  await session.send('Fetch.enable', { patterns: [{ urlPattern, requestStage: 'Response' }] });
}
