import type { Hand } from './hand';

/** The next such command of the page arrives at the server, and its answer is lost on the way back. */
export async function losesAnswerOf({ context, page }: Hand, urlPattern: string): Promise<void> {
  const session = await context.newCDPSession(page);
  session.on('Fetch.requestPaused', ({ requestId, request }) => {
    if (request.method !== 'POST') return void session.send('Fetch.continueRequest', { requestId });
    void session.send('Fetch.failRequest', { requestId, errorReason: 'ConnectionReset' }).then(() => session.detach());
  });
  await session.send('Fetch.enable', { patterns: [{ urlPattern, requestStage: 'Response' }] });
}
