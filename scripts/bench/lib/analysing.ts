import { randomUUID } from 'node:crypto';
import { rm } from 'node:fs/promises';
import { join } from 'node:path';
import { connect, type Connection } from '@/db/connect';
import { demoIds } from '@/db/demo/seed';
import { pause } from './lab-client';

/**
 * A process that does what an analyst does, without a rest, until its parent lets go: brings a file of a million rows in, in parts and then into a channel, and has
 * the report of a night made meanwhile. Tells of each that is done. What breaks off, since the server has no database at the moment, is begun anew.
 */

export interface AnalysingSetting {
  address: string;
  cookie: string;
  databaseUrl: string;
  /** Where the server keeps its files. */
  filesDir: string;
}

export type AnalysisTold = 'ready' | 'import' | 'report' | { wrong: string } | { broken: string };

const rows = 1_000_000;
const partBytes = 8 * 1_048_576;
const importsAVacuum = 5;
const mapping = { delimiter: ',', decimal: '.', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'urad' };
const labPath = `/labs/${demoIds.lab}`;

const tell = (told: AnalysisTold) => {
  if (process.connected) process.send?.(told);
};

/** 100 Hz of deflection up to the end of a run. */
function fileUntil(endUtcMs: number): Buffer<ArrayBuffer> {
  const lines = Array.from(
    { length: rows },
    (_, index) => `${new Date(endUtcMs - 10 * (rows - index)).toISOString()},${(100 * Math.sin(index / 4000)).toFixed(3)}`,
  );
  return Buffer.from(`time_utc,deflection_urad\n${lines.join('\n')}\n`);
}

class Analyst {
  ending = false;

  constructor(private readonly setting: AnalysingSetting) {}

  /** Imports and reports of a rehearsed night, side by side. */
  async work(connection: Connection): Promise<void> {
    const { runId, evaluationId, endUtcMs } = await this.night();
    await this.report(evaluationId);
    const file = fileUntil(endUtcMs);
    tell('ready');
    await Promise.all([
      this.again('report', () => this.report(evaluationId)),
      this.again('import', (number) => this.bringIn(connection, { file, runId, number })),
    ]);
  }

  private async again(what: 'import' | 'report', work: (number: number) => Promise<string | null>): Promise<void> {
    for (let number = 1; !this.ending; number += 1)
      try {
        const wrong = await work(number);
        tell(wrong === null ? what : { wrong });
      } catch (error) {
        tell({ broken: error instanceof Error ? error.message : String(error) });
        await pause(100);
      }
  }

  private async night(): Promise<{ runId: string; evaluationId: string; endUtcMs: number }> {
    const asked = { rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, seed: 3 };
    const { id: runId } = await this.post<{ id: string }>(`${labPath}/rehearsals`, asked);
    const { endedAt } = await this.until<{ state: string; endedAt: string }>(`${labPath}/runs/${runId}`, 'finished');
    const { id: evaluationId } = await this.post<{ id: string }>(`${labPath}/runs/${runId}/evaluations`, {});
    await this.until(`${labPath}/evaluations/${evaluationId}`, 'done');
    return { runId, evaluationId, endUtcMs: Date.parse(endedAt) };
  }

  private async report(evaluationId: string): Promise<string | null> {
    const answer = await this.ask('GET', `${labPath}/evaluations/${evaluationId}/report.pdf`);
    const pdf = Buffer.from(await answer.arrayBuffer());
    return pdf.toString('latin1', 0, 5) === '%PDF-' ? null : 'a report is no PDF';
  }

  private async bringIn(connection: Connection, { file, runId, number }: { file: Buffer<ArrayBuffer>; runId: string; number: number }) {
    const channelName = `import ${String(number)}`;
    try {
      const begun = { fileName: 'night.csv', bytes: file.length };
      const { id } = await this.post<{ id: string }>(`${labPath}/runs/${runId}/imports`, begun);
      for (let offset = 0; offset < file.length; offset += partBytes)
        await this.ask('PATCH', `${labPath}/imports/${id}/content?offset=${String(offset)}`, {
          type: 'text/csv',
          content: file.subarray(offset, offset + partBytes),
        });
      const { stored } = await this.post<{ stored: number }>(`${labPath}/imports/${id}/commit`, { mapping, channelName });
      return stored === rows ? null : `an import of ${String(rows)} rows stored ${String(stored)}`;
    } finally {
      await this.tidy(connection, { channelName, number });
    }
  }

  /** Nothing is left of what was brought in, so that the disk does not fill however long this goes on. */
  private async tidy({ pool }: Connection, { channelName, number }: { channelName: string; number: number }): Promise<void> {
    const mine = 'select id from channels where lab_id = $1 and name = $2';
    for (const table of ['samples', 'sample_summaries'])
      await pool.query(`delete from ${table} where lab_id = $1 and channel_id in (${mine})`, [demoIds.lab, channelName]);
    await pool.query('delete from import_pieces');
    await rm(join(this.setting.filesDir, 'imports'), { recursive: true, force: true });
    if (number % importsAVacuum === 0) await pool.query('vacuum samples, sample_summaries, import_pieces');
  }

  private async post<T>(path: string, body: object): Promise<T> {
    return (await (await this.ask('POST', path, { type: 'application/json', content: JSON.stringify(body) })).json()) as T;
  }

  private async until<T extends { state: string }>(path: string, state: string): Promise<T> {
    for (let looks = 0; looks < 600; looks += 1, await pause(100)) {
      const seen = (await (await this.ask('GET', path)).json()) as T;
      if (seen.state === state) return seen;
    }
    throw new Error(`${path} did not become ${state}`);
  }

  private async ask(method: string, path: string, body?: { type: string; content: string | Buffer<ArrayBuffer> }): Promise<Response> {
    const { address, cookie } = this.setting;
    const answer = await fetch(`${address}/api${path}`, {
      method,
      headers: {
        Cookie: cookie,
        Origin: address,
        'Idempotency-Key': randomUUID(),
        ...(body === undefined ? {} : { 'Content-Type': body.type }),
      },
      ...(body === undefined ? {} : { body: body.content }),
    });
    if (!answer.ok) throw new Error(`${method} ${path}: ${String(answer.status)} ${await answer.text()}`);
    return answer;
  }
}

async function run(setting: AnalysingSetting): Promise<void> {
  const connection = connect({ url: setting.databaseUrl, maxConnections: 1, statementTimeoutMs: 0 });
  // No summary has to be computed anew where all of a channel goes.
  await connection.pool.query('set session_replication_role = replica');
  const analyst = new Analyst(setting);
  process.on('disconnect', () => {
    analyst.ending = true;
  });
  await analyst.work(connection);
  await connection.close();
}

void run(JSON.parse(process.argv[2] as string) as AnalysingSetting);
