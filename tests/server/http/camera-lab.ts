import type request from 'supertest';
import { demoIds } from '@/db/demo/seed';
import type { CameraView, FrameView } from '@/shared/contracts/cameras';
import type { StepRowView } from '@/shared/contracts/runs';
import { LoopbackCamera } from '@/tests/support/camera-on-loopback';
import { databaseOfThisFile, type TestDatabase } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

export const camerasPath = `/labs/${demoIds.lab}/rigs/${demoIds.rig}/cameras`;

export const asBytes: Parameters<request.Test['parse']>[0] = (res, done) => {
  const parts: Buffer[] = [];
  res.on('data', (part: Buffer) => parts.push(part));
  res.on('end', () => done(null, Buffer.concat(parts)));
};

interface Cameras {
  items: CameraView[];
  hosts: string[];
  simulated: boolean;
}

/** The demo lab with a camera on loopback that it may ask. */
class CameraLab {
  private constructor(
    readonly lab: LabServer,
    readonly camera: LoopbackCamera,
  ) {}

  static async start(database: TestDatabase): Promise<CameraLab> {
    const camera = await LoopbackCamera.start();
    const devices = { batchBytes: 1_048_576, batchesPerMinute: 6, samplesPerMinute: 100 };
    const lab = await LabServer.start(database, { overrides: { paceMs: 1_000 }, config: { cameraHosts: [camera.host], devices } });
    return new CameraLab(lab, camera);
  }

  async stop(): Promise<void> {
    await this.lab.stop();
    await this.camera.stop();
  }

  /** Ends the run that goes on, removes what the demo has not. */
  async tidy(): Promise<void> {
    const driver = this.lab.services.supervisor.activeOf(demoIds.rig);
    if (driver !== null) {
      await this.lab.intervene(driver.runId, 'stop');
      await this.lab.advance(60_000, () => driver.isOver());
    }
    for (const { id, kind } of (await this.list()).items) if (kind !== 'drawn') await this.remove(id);
  }

  async list(): Promise<Cameras> {
    return (await this.lab.as('viewer', 'GET', camerasPath).expect(200)).body as Cameras;
  }

  async named(name: string): Promise<CameraView | undefined> {
    return (await this.list()).items.find((each) => each.name === name);
  }

  add(body: object): request.Test {
    return this.lab.as('owner', 'POST', camerasPath).send(body);
  }

  addAddress(change: object = {}): request.Test {
    return this.add({ kind: 'address', name: 'Door side', address: this.camera.address, userName: null, password: null, ...change });
  }

  remove(id: string): request.Test {
    return this.lab.as('owner', 'DELETE', `${camerasPath}/${id}`).expect(204);
  }

  async framesOf(runId: string, name?: string): Promise<FrameView[]> {
    const { body } = await this.lab.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${runId}/frames`).expect(200);
    return (body as { items: FrameView[] }).items.filter((frame) => name === undefined || frame.camera === name);
  }

  async pictureOf(runId: string, { id }: FrameView): Promise<{ bytes: Buffer; headers: Record<string, string> }> {
    const address = `/labs/${demoIds.lab}/runs/${runId}/frames/${id}/picture`;
    const answer = await this.lab.as('viewer', 'GET', address).buffer(true).parse(asBytes).expect(200);
    return { bytes: answer.body as Buffer, headers: answer.headers as Record<string, string> };
  }

  async rowsOf(runId: string): Promise<StepRowView[]> {
    const { body } = await this.lab.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${runId}/steps`).expect(200);
    return (body as { items: StepRowView[] }).items;
  }

  /** Turns of the loopback between seconds of the server's clock. */
  async until(there: () => Promise<boolean>): Promise<void> {
    for (let turn = 0; turn < 100; turn += 1) {
      if (await there()) return;
      await this.lab.advance(1_000);
      for (let breath = 0; breath < 50; breath += 1) await new Promise<void>((resolve) => void setImmediate(resolve));
    }
    throw new Error('it never came to that');
  }
}

/** The lab of a test file, which every test leaves as the demo has it. */
export function cameraLabOfThisFile(): () => CameraLab {
  const database = databaseOfThisFile();
  let at: CameraLab;
  jest.setTimeout(60_000);
  beforeAll(async () => {
    at = await CameraLab.start(database());
  }, 60_000);
  afterAll(() => at.stop());
  afterEach(() => at.tidy());
  return () => at;
}
