import { filesOfNothing, forgetFile } from '@/server/store/files';
import { forgetUnfinished, unmovedImports } from '@/server/store/import-files';
import { moveIntoStore } from '../import-file';
import type { Services } from '../services';

const dayMs = 24 * 3_600_000;
/** Whoever was cut off has so long to go on. */
const unfinishedMs = 7 * dayMs;
/** A file that came whole waits so long for being stored. */
const unstoredMs = 30 * dayMs;
/** A file that is being put into the store belongs to nothing yet. */
const putMs = dayMs;

/** What belongs to nothing goes: files that came in part and were not gone on with, files that nobody stored, objects that nothing refers to. */
export async function tidyFiles(services: Services): Promise<void> {
  const { db } = services.database;
  const nowUtcMs = services.clock.utcMs();
  await forgetUnfinished(db, { states: ['waiting', 'refused'], beforeUtcMs: nowUtcMs - unfinishedMs });
  await forgetUnfinished(db, { states: ['received'], beforeUtcMs: nowUtcMs - unstoredMs });
  for (const file of await unmovedImports(db)) await moveIntoStore(services, file);
  for (const name of await filesOfNothing(db, nowUtcMs - putMs)) {
    await services.objects.remove(name);
    await forgetFile(db, name);
  }
}
