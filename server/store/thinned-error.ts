import { DatabaseError } from 'pg';

/** Samples were to go where the summaries alone are left: they would be taken for all that there was, so nothing was stored. */
export class ThinnedSamplesError extends Error {
  override readonly name = 'ThinnedSamplesError';
  constructor(
    readonly channelId: string,
    readonly fromUtcMs: number,
    readonly toUtcMs: number,
  ) {
    super('the channel was thinned to its summaries there');
  }
}

/** As `refuse_thinned` of the database says it. */
const thinnedCode = 'EVTHN';
const detail = /^(\S+) "([^"]+)" "([^"]+)"$/;

/** @throws ThinnedSamplesError in place of what the database says; any other failure as it is */
export async function tellingThinned<T>(work: Promise<T>): Promise<T> {
  try {
    return await work;
  } catch (error) {
    const said = error instanceof DatabaseError && error.code === thinnedCode ? detail.exec(error.detail ?? '') : null;
    if (said === null) throw error;
    const [, channelId = '', from = '', to = ''] = said;
    throw new ThinnedSamplesError(channelId, Date.parse(from), Date.parse(to));
  }
}
