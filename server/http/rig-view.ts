import type { RigLive, RigSummary, RigView } from '@/shared/contracts/rigs';
import type { ArmingView, ArmView, LockView, SignatureView } from '@/shared/contracts/standing';
import type { ArmingNow } from '../engine/arming';
import type { StandingArm } from '../interfaces/arm-keeper';
import type { PersonalLock } from '../interfaces/lock-keeper';
import type { RigStation } from '../interfaces/rig-stations';
import type { KnownPosition } from '../engine/run-context';
import { restored } from '../engine/stored-snapshot';
import { signaturesOf, type SignatureRow } from '../store/locks';
import { listMassSets, type RigRecord } from '../store/rigs';
import { activeRuns, newestSnapshots, type RunListRow } from '../store/runs-read';
import { isoOf, isoOrNull } from './maker';
import { positionViewOf } from './position-view';
import type { Services } from './services';

const linkTag = (services: Services, rig: RigRecord) => services.sha256(JSON.stringify(rig.link)).slice(0, 12);

/** The ETag of a rig: its revision and its line, which change apart. */
export const rigTag = (services: Services, rig: RigRecord): string => `${String(rig.revision)}-${linkTag(services, rig)}`;

/** Whether whoever sends this ETag has looked at the revision that holds now. */
export const knowsRevision = (tag: string | null, rig: RigRecord): boolean => tag?.split('-')[0] === String(rig.revision);

/** Whether whoever sends this ETag has looked at the line that holds now. */
export const knowsLink = (services: Services, tag: string | null, rig: RigRecord): boolean => tag?.split('-')[1] === linkTag(services, rig);

/** The live state of a rig's line and turntable; what the line has not told is null. */
function rigLiveOf(station: RigStation | null, drivesRigs: boolean): RigLive {
  if (station === null)
    return {
      condition: 'closed',
      detail: drivesRigs ? 'this server does not drive the rig' : 'no process drives the rig at the moment',
      lastReplyAt: null,
      roundTripMs: null,
      discardedLines: 0,
      positionKnown: false,
      angleDeg: null,
      moving: false,
      interlockClosed: null,
      supplyPresent: null,
      armKey: null,
      driversOn: null,
    };
  const health = station.link.health();
  const controller = station.link.controller();
  return {
    condition: health.condition,
    detail: health.detail,
    lastReplyAt: isoOrNull(health.lastReplyUtcMs),
    roundTripMs: health.roundTripMs,
    discardedLines: health.discardedLines,
    positionKnown: controller?.positionKnown ?? false,
    angleDeg: controller?.angleDeg ?? null,
    moving: controller?.moving ?? false,
    interlockClosed: controller?.interlockClosed ?? null,
    supplyPresent: controller?.supplyPresent ?? null,
    armKey: controller?.armKey ?? null,
    driversOn: controller?.driversOn ?? null,
  };
}

const armViewOf = (arm: StandingArm): ArmView => ({
  id: arm.id,
  name: arm.name,
  from: isoOf(arm.fromUtcMs),
  until: isoOf(arm.untilUtcMs),
  note: arm.note,
});

export const armingViewOf = ({ request, stage, endsUtcMs }: ArmingNow): ArmingView => ({
  name: request.name,
  until: isoOf(request.untilUtcMs),
  stage,
  endsAt: isoOf(endsUtcMs),
});

export const lockViewOf = ({ id, userId, name, note, setUtcMs }: PersonalLock): LockView => ({
  id,
  userId,
  name,
  note,
  since: isoOf(setUtcMs),
});

export const signatureViewOf = ({ userId, name, version, signedAt }: SignatureRow): SignatureView => ({
  userId,
  name,
  version,
  at: isoOf(signedAt),
});

/** Whether and for whom the rig may be set in motion, out of memory alone. */
export function standingOf(
  { arms, arming, locks }: Pick<Services, 'arms' | 'arming' | 'locks'>,
  rigId: string,
): Pick<RigSummary, 'arm' | 'arming' | 'disarmed' | 'locks'> {
  const [arm, going, ended] = [arms.armOf(rigId), arming.of(rigId), arms.endedOf(rigId)];
  return {
    arm: arm === null ? null : armViewOf(arm),
    arming: going === null ? null : armingViewOf(going),
    disarmed: ended === null ? null : { name: ended.name, why: ended.why, at: isoOf(ended.atUtcMs) },
    locks: locks.locksOf(rigId).map(lockViewOf),
  };
}

export function rigSummaryOf(services: Services, rig: RigRecord, run: RunListRow | undefined): RigSummary {
  return {
    id: rig.id,
    name: rig.name,
    revision: rig.revision,
    link: rig.link,
    live: rigLiveOf(services.stations.get(rig.id), services.config.roles.includes('rig')),
    ...standingOf(services, rig.id),
    activeRun:
      run === undefined
        ? null
        : { id: run.id, state: services.supervisor.activeOf(rig.id)?.facts().state ?? run.state, protocolName: run.protocolName },
  };
}

export async function rigViewOf(services: Services, rig: RigRecord): Promise<RigView> {
  const { db } = services.database;
  const runs = await activeRuns(db, rig.labId);
  return {
    ...rigSummaryOf(services, rig, runs.get(rig.id)),
    document: rig.document,
    massSets: await listMassSets(db, rig.labId, rig.id),
    signatures: (await signaturesOf(db, { labId: rig.labId, rigId: rig.id })).map(signatureViewOf),
    position: await positionOf(services, rig),
  };
}

/** From the run that goes on, or else from the newest that has met the edge. */
async function positionOf(services: Services, rig: RigRecord): Promise<RigView['position']> {
  const active = services.supervisor.activeOf(rig.id);
  const now = active?.facts().position ?? null;
  if (active !== null && now !== null && hasMetEdge(now)) return { ...positionViewOf(rig.document, now), runId: active.runId };
  for (const run of await newestSnapshots(services.database.db, { labId: rig.labId, rigId: rig.id })) {
    const position = restored(run.snapshot, run.chartVersion)?.context.position;
    if (position !== undefined && hasMetEdge(position)) return { ...positionViewOf(run.start.rig, position), runId: run.id };
  }
  return null;
}

const hasMetEdge = ({ proof }: KnownPosition) => proof.proved !== null || proof.slip !== null;
