import type { Sha256 } from '@/shared/archive/chain';
import type { StandingArm } from '../interfaces/arm-keeper';
import type { StandingStore } from '../interfaces/standing-store';
import { armRig, currentArm, endArm, newestArm, type Arm } from './arms';
import { appendAudit } from './audit';
import type { Connection } from './database';
import { insertLock, standingLocks } from './locks';

const standing = ({ id, name, note, fromAt: fromUtcMs, untilAt: untilUtcMs, bootId }: Arm): StandingArm => ({
  ...{ id, name, note, fromUtcMs, untilUtcMs, bootId },
});

/** Arms and personal locks in the database. */
export function createStandingStore(database: Pick<Connection, 'db'>, sha256: Sha256): StandingStore {
  return {
    async newestArm(rig) {
      const arm = await newestArm(database.db, rig);
      return arm === null ? null : { ...standing(arm), endedUtcMs: arm.endedAt, endedWhy: arm.endedWhy };
    },

    giveArm({ labId, rigId, name, note, fromUtcMs, untilUtcMs, bootId, by }) {
      const data = { rigId, name, until: new Date(untilUtcMs).toISOString() };
      return database.db.transaction(async (tx) => {
        await appendAudit(tx, { labId, who: by, kind: 'rig.armed', data, utcMs: fromUtcMs }, sha256);
        const arm = { ...{ labId, rigId, name, note, untilUtcMs }, armedById: by.id, bootId: bootId ?? '', nowUtcMs: fromUtcMs };
        return standing(await armRig(tx, arm));
      });
    },

    async notArmed({ labId, rigId }, { name, why, by: who, atUtcMs: utcMs }) {
      const fact = { labId, who, kind: 'rig.not-armed', data: { rigId, name, why }, utcMs };
      await database.db.transaction((tx) => appendAudit(tx, fact, sha256));
    },

    async endArm({ labId, rigId }, { armId, why, by: who, atUtcMs: utcMs }) {
      await database.db.transaction(async (tx) => {
        const arm = await currentArm(tx, { labId, rigId, nowUtcMs: utcMs });
        if (arm?.id !== armId) return;
        await endArm(tx, { labId, rigId, nowUtcMs: utcMs, why });
        await appendAudit(tx, { labId, who, kind: 'rig.arm-ended', data: { rigId, why }, utcMs }, sha256);
      });
    },

    async locksOf(rig) {
      const rows = await standingLocks(database.db, rig);
      return rows.map(({ id, userId, name, note, setAt }) => ({ ...rig, id, userId, name, note, setUtcMs: setAt }));
    },

    async setLock({ id, labId, rigId, userId, name, note, setUtcMs }) {
      await database.db.transaction(async (tx) => {
        if (!(await insertLock(tx, { id, labId, rigId, userId, name, note, setAt: setUtcMs }))) return;
        const data = { rigId, lockId: id, note };
        await appendAudit(tx, { labId, who: { id: userId, name }, kind: 'rig.lock-set', data, utcMs: setUtcMs }, sha256);
      });
    },
  };
}
