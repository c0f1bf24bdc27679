import type { BenchMaker, LinkBench } from './bench';
import { LinkWatch } from './link-watch';

/** The bench and the link of the test that is running. */
export class Scene {
  bench!: LinkBench;
  watch!: LinkWatch;
  /** Grows from test to test: a controller that is kept between them refuses older ones. */
  epoch = 0;

  constructor(private readonly maker: BenchMaker) {}

  async begin(made: Promise<LinkBench> = this.maker.make()): Promise<void> {
    this.bench = await made;
    this.epoch = this.bench.epoch ?? this.epoch + 1;
    this.watch = new LinkWatch(this.bench, this.epoch);
  }

  async end(): Promise<void> {
    await this.watch.link.close();
    await this.bench.dispose();
  }

  /** Lets time pass until a promise is settled. */
  async settled<T>(promise: Promise<T>): Promise<T> {
    let over = false;
    void promise.finally(() => {
      over = true;
    });
    await this.bench.until('the answer', () => over, 15_000);
    return promise;
  }
}
