import { MissingObjectError, type ObjectStore } from '@/server/interfaces/object-store';

/** An object store that ends with the test. */
export class MemoryObjects implements ObjectStore {
  readonly kept = new Map<string, Buffer>();
  /** What every act fails with. */
  failing: Error | null = null;
  free: number | null = null;

  async put(name: string, source: AsyncIterable<Uint8Array>): Promise<void> {
    const chunks: Uint8Array[] = [];
    for await (const chunk of source) chunks.push(chunk);
    this.assertThere();
    this.kept.set(name, Buffer.concat(chunks));
  }

  async *read(name: string): AsyncGenerator<Uint8Array> {
    this.assertThere();
    const found = this.kept.get(name);
    if (found === undefined) throw new MissingObjectError(name);
    yield found;
  }

  async remove(name: string): Promise<void> {
    this.assertThere();
    this.kept.delete(name);
  }

  async freeBytes(): Promise<number | null> {
    return this.free;
  }

  close(): void {
    return undefined;
  }

  private assertThere(): void {
    if (this.failing !== null) throw this.failing;
  }
}
