import { Follower } from './follower';
import { LabClient, pause } from './lab-client';

/** A process that starts a run, lets so many pages follow it, stops it, and does so again. Tells when each stop was sent. */

export interface StoppingSetting {
  address: string;
  cookie: string;
  /** Of those who follow; each has six pages at most. */
  viewers: string[];
  pages: number;
  stops: number;
}

/** Nanoseconds of the clock that all processes of the machine share, as text. */
export interface StopSent {
  sentNs: string;
}

const longestPauseMs = 300;

async function run({ address, cookie, viewers, pages, stops }: StoppingSetting): Promise<void> {
  const lab = new LabClient(address, cookie);
  const protocolId = await lab.issue({ formatVersion: 1, name: 'One long dwell', steps: [{ kind: 'dwell', for_s: 3600 }] });
  for (let number = 0; number < stops; number += 1) {
    // A stop ends the arm.
    await lab.arm();
    const runId = await lab.start(protocolId);
    const followers = Array.from({ length: pages }, (_, index) => new Follower(address, viewers[index % viewers.length] as string));
    await Promise.all(followers.map((page) => page.follow(runId)));
    // Spread over the heartbeat of the link.
    await pause(((number * 0.618) % 1) * longestPauseMs);
    const sentNs = String(process.hrtime.bigint());
    await lab.intervene(runId, 'stop');
    process.send?.({ sentNs } satisfies StopSent);
    await lab.until(runId, ({ state }) => state === 'stopped');
    for (const page of followers) page.leave();
  }
  process.disconnect();
}

void run(JSON.parse(process.argv[2] as string) as StoppingSetting);
