import type { StandingEntry, StandingJournal } from '@/server/interfaces/standing-journal';

/** What a disk would keep of locks and ends of arms: whoever holds the object holds the disk. */
export class MemoryStanding implements StandingJournal {
  private texts: string[] = [];

  async keep(entry: StandingEntry): Promise<void> {
    this.texts.push(JSON.stringify(entry));
  }

  async of(rigId: string): Promise<StandingEntry[]> {
    const all = this.texts.map((text) => JSON.parse(text) as StandingEntry);
    return all.filter((entry) => (entry.kind === 'lock-set' ? entry.lock : entry.end).rigId === rigId);
  }

  async forget(entry: StandingEntry): Promise<void> {
    this.texts = this.texts.filter((text) => text !== JSON.stringify(entry));
  }
}
