import { createHash } from 'node:crypto';
import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';

/** As much of S3's REST API as the product uses, in memory: PutObject, GetObject, DeleteObject with paths, keys and digests checked. */
export class FakeS3 {
  readonly kept = new Map<string, Buffer>();
  readonly keyId = 'test-key';
  /** Every request is answered so; null: as S3 does. */
  refusing: number | null = null;
  private server: Server | null = null;

  async listen(): Promise<string> {
    const server = createServer((req, res) => {
      void this.answer(req, res).catch(() => res.destroy());
    });
    this.server = server;
    await new Promise<void>((resolve) => void server.listen(0, '127.0.0.1', resolve));
    return `http://127.0.0.1:${String((server.address() as AddressInfo).port)}`;
  }

  async close(): Promise<void> {
    this.server?.closeAllConnections();
    await new Promise((resolve) => this.server?.close(resolve));
  }

  private async answer(req: IncomingMessage, res: ServerResponse): Promise<void> {
    const chunks: Buffer[] = [];
    for await (const chunk of req) chunks.push(chunk as Buffer);
    const path = decodeURIComponent((req.url ?? '').split('?')[0] ?? '');
    const refuse = (status: number, code: string) =>
      res.writeHead(status, { 'content-type': 'application/xml' }).end(`<Error><Code>${code}</Code><Message>${code}</Message></Error>`);
    if (this.refusing !== null) return void refuse(this.refusing, 'ServiceUnavailable');
    if (req.headers.authorization?.includes(`Credential=${this.keyId}/`) !== true) return void refuse(403, 'InvalidAccessKeyId');
    if (req.method === 'PUT') {
      const body = Buffer.concat(chunks);
      // A body in chunks with signatures of their own would be kept with them by servers that do not know that.
      if (req.headers['content-encoding'] !== undefined) return void refuse(501, 'NotImplemented');
      if (req.headers['x-amz-checksum-sha256'] !== createHash('sha256').update(body).digest('base64')) return void refuse(400, 'BadDigest');
      this.kept.set(path, body);
      return void res.writeHead(200, { etag: '"1"' }).end();
    }
    if (req.method === 'DELETE') {
      this.kept.delete(path);
      return void res.writeHead(204).end();
    }
    const found = this.kept.get(path);
    if (found === undefined) return void refuse(404, 'NoSuchKey');
    res.writeHead(200, { 'content-type': 'application/octet-stream', 'content-length': String(found.length) }).end(found);
  }
}
