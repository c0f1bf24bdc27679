import { randomUUID } from 'node:crypto';
import { demoIds, demoPeople } from '@/db/demo/seed';
import * as schema from '@/db/schema';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { BenchDatabase } from './fresh-database';

export interface BenchRig {
  id: string;
  massSetId: string;
}

/** So many simulated rigs in the demo lab, the demo rig among them, each with a mass set and a deflection channel. */
export async function manyRigs({ connection: { db } }: BenchDatabase, count: number): Promise<BenchRig[]> {
  const nowUtcMs = Date.now();
  const keeper = demoPeople.find(({ role }) => role === 'keeper');
  if (keeper === undefined) throw new Error('the demo has no keeper');
  const rigs: BenchRig[] = [{ id: demoIds.rig, massSetId: demoIds.massSet }];
  while (rigs.length < count) {
    const rig = { id: randomUUID(), massSetId: randomUUID() };
    const name = `Bench ${String(rigs.length + 1)}`;
    const own = { labId: demoIds.lab, rigId: rig.id };
    await db.insert(schema.rigs).values({ labId: demoIds.lab, id: rig.id, name, revision: 1, createdAt: nowUtcMs });
    await db.insert(schema.rigRevisions).values({
      ...{ ...own, number: 1, name, document: demoRigWide, reason: 'First measurement of the rig' },
      ...{ madeAt: nowUtcMs, madeById: keeper.id, madeBy: keeper.name },
    });
    await db.insert(schema.rigLinks).values({ ...own, settings: { kind: 'simulated' }, changedAt: nowUtcMs, changedBy: keeper.name });
    await db
      .insert(schema.massSets)
      .values({ ...own, id: rig.massSetId, label: 'Lead spheres', sources: demoRigWide.sources, createdAt: nowUtcMs });
    await db.insert(schema.channels).values({
      ...{ ...own, id: randomUUID(), name: 'deflection', quantity: 'pendulum angle', unit: 'rad' },
      ...{ role: 'deflection' as const, source: 'simulated' as const, createdAt: nowUtcMs },
    });
    rigs.push(rig);
  }
  return rigs;
}
