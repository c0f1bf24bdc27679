import { randomUUID } from 'node:crypto';
import { Agent, request } from 'node:http';
import { demoIds } from '@/db/demo/seed';
import type { RunView } from '@/shared/contracts/runs';
import { cautionsVersion } from '@/shared/rig/cautions';
import type { ProtocolDocument } from '@/shared/protocol/document';

interface Answer {
  status: number;
  etag: string;
  body: unknown;
}

const agent = new Agent({ keepAlive: true });
const runs = `/labs/${demoIds.lab}/runs`;
const patienceMs = 30_000;

export const pause = (ms: number): Promise<void> => new Promise((resolve) => void setTimeout(resolve, ms));

/** A member of the demo lab at a server's address, at one of its rigs. Every request that is refused throws the server's own words. */
export class LabClient {
  constructor(
    readonly address: string,
    readonly cookie: string,
    private readonly rig: { id: string; massSetId: string } = { id: demoIds.rig, massSetId: demoIds.massSet },
  ) {}

  get(path: string): Promise<Answer> {
    return this.ask({ method: 'GET', path });
  }

  post(path: string, body: object, headers: Record<string, string> = {}): Promise<Answer> {
    return this.ask({ method: 'POST', path, body, headers });
  }

  /** Makes a protocol and issues its first revision on the client's rig. Returns its id. */
  async issue(document: ProtocolDocument): Promise<string> {
    const made = await this.post(`/labs/${demoIds.lab}/protocols`, { document });
    const { id } = made.body as { id: string };
    await this.post(`/labs/${demoIds.lab}/protocols/${id}/revisions`, { rigId: this.rig.id }, { 'If-Match': made.etag });
    return id;
  }

  /**
   * Waits until the rig of a server that has just begun is ready for a start, signs its cautions and arms it for 12 h. The key of a simulated rig
   * is virtual and its exit delay short; of another, `turnKey` turns it and `patienceMs` is longer than its exit delay.
   */
  async arm({
    turnKey,
    patienceMs: patience = patienceMs,
  }: { turnKey?: (on: boolean) => Promise<void>; patienceMs?: number } = {}): Promise<void> {
    const rig = `/labs/${demoIds.lab}/rigs/${this.rig.id}`;
    await this.patiently('the link of the rig', async () => {
      const { live } = (await this.get(rig)).body as { live: { condition: string } };
      return live.condition === 'ready' || null;
    });
    const until = new Date(Date.now() + 12 * 3_600_000).toISOString();
    await this.sign();
    await this.post(`${rig}/arm`, { name: 'Ilse Marrowby', until });
    for (const armKey of ['off', 'on']) {
      await (turnKey === undefined ? this.post(`${rig}/virtual`, { armKey }) : turnKey(armKey === 'on'));
      await this.patiently('the arm key', async () => {
        const { live } = (await this.get(rig)).body as { live: { armKey: boolean } };
        return live.armKey === (armKey === 'on') || null;
      });
    }
    await this.patiently('the exit delay', async () => ((await this.get(rig)).body as { arm: object | null }).arm, patience);
  }

  async sign(): Promise<void> {
    await this.post(`/labs/${demoIds.lab}/rigs/${this.rig.id}/cautions`, { version: cautionsVersion });
  }

  /** Starts the first revision of a protocol on the client's rig as soon as the server lets it, and waits until it runs. Returns the run's id. */
  async start(protocolId: string): Promise<string> {
    const choice = { protocolId, revision: 1, massSetId: this.rig.massSetId };
    const start = async () => {
      const review = await this.post(`/labs/${demoIds.lab}/rigs/${this.rig.id}/start-review`, choice);
      const { token: reviewToken } = review.body as { token: string };
      return this.post(runs, { rigId: this.rig.id, ...choice, reviewToken, tappedAt: new Date().toISOString() });
    };
    const { id } = (await this.patiently('a start', start)).body as { id: string };
    await this.until(id, ({ state }) => state === 'running');
    return id;
  }

  async run(runId: string): Promise<RunView> {
    return (await this.get(`${runs}/${runId}`)).body as RunView;
  }

  intervene(runId: string, what: 'hold' | 'stop'): Promise<Answer> {
    return this.post(`${runs}/${runId}/${what}`, {});
  }

  /** Resumes as a person does, who has seen the review of it and tries again where the server says that it is too early. */
  async resume(runId: string): Promise<void> {
    await this.patiently('to resume', async () => {
      const { token: reviewToken } = (await this.post(`${runs}/${runId}/resume-review`, {})).body as { token: string };
      return this.post(`${runs}/${runId}/resume`, { reviewToken, tappedAt: new Date().toISOString() });
    });
  }

  /** Reads, as soon as the server has its database. */
  read(path: string): Promise<Answer> {
    return this.patiently(path, () => this.get(path));
  }

  until(runId: string, there: (view: RunView) => boolean): Promise<RunView> {
    return this.patiently('a run', async () => {
      const view = await this.run(runId);
      if (there(view)) return view;
      throw new Error(`it is ${view.state}: ${view.reason}`);
    });
  }

  /** Looks again and again; what is refused may be let in the next time. */
  private async patiently<T>(what: string, look: () => Promise<T | null>, forMs = patienceMs): Promise<T> {
    let why: unknown = null;
    for (const began = performance.now(); performance.now() - began < forMs;) {
      try {
        const found = await look();
        if (found !== null) return found;
      } catch (error) {
        why = error;
      }
      await pause(20);
    }
    throw new Error(`${what} was waited for in vain`, { cause: why });
  }

  private ask({ method, path, body, headers }: { method: string; path: string; body?: object; headers?: object }): Promise<Answer> {
    const text = body === undefined ? '' : JSON.stringify(body);
    return new Promise((resolve, reject) => {
      const asked = request(
        `${this.address}/api${path}`,
        {
          method,
          agent,
          headers: {
            Cookie: this.cookie,
            Origin: this.address,
            'Idempotency-Key': randomUUID(),
            ...(text === '' ? {} : { 'Content-Type': 'application/json', 'Content-Length': Buffer.byteLength(text) }),
            ...headers,
          },
        },
        (response) => {
          const parts: Buffer[] = [];
          response.on('data', (part: Buffer) => parts.push(part));
          response.on('error', reject);
          response.on('end', () => {
            const answer = Buffer.concat(parts).toString();
            const status = response.statusCode ?? 0;
            if (status >= 400) reject(new Error(`${method} ${path}: ${String(status)} ${answer}`));
            else resolve({ status, etag: response.headers.etag ?? '', body: answer === '' ? null : (JSON.parse(answer) as unknown) });
          });
        },
      );
      asked.on('error', (error) => {
        // The server had closed the idle connection at that very moment; to look again does no harm.
        if (method === 'GET' && asked.reusedSocket) this.ask({ method, path, headers }).then(resolve, reject);
        else reject(error);
      });
      asked.end(text);
    });
  }
}
