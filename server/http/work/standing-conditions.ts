import { brokersOf, type BrokerRecord } from '../../store/brokers';
import { camerasOf, type CameraRecord } from '../../store/cameras';
import { limitsOfRig } from '../../store/channel-limits';
import type { Connection } from '../../store/database';
import type { RigRecord } from '../../store/rigs';
import { limitConditions, type LimitView } from './channel-conditions';
import type { Condition } from './rig-conditions';

/** What holds of a rig whether a run goes on or not: limits of its channels, brokers and cameras that are away. */
export async function standingConditions(connection: Connection, { labId, id }: RigRecord, view: LimitView): Promise<Condition[]> {
  const limits = await limitConditions(connection, await limitsOfRig(connection.db, labId, id), view);
  const ofRig = { labId, rigId: id };
  return [
    ...limits,
    ...brokerConditions(await brokersOf(connection.db, ofRig), view.utcMs),
    ...cameraConditions(await camerasOf(connection.db, ofRig), view.utcMs),
  ];
}

/** The server that listens tells what it hears at least this often; what is older is not of now, ms. */
const toldMs = 60_000;

export function brokerConditions(
  brokers: readonly Pick<BrokerRecord, 'id' | 'address' | 'topics' | 'status'>[],
  utcMs: number,
): Condition[] {
  return brokers.flatMap(({ id, address, topics, status }) => {
    if (status?.state !== 'away' || utcMs - Date.parse(status.toldAt) > toldMs) return [];
    const names = [...new Set(topics.map(({ channel }) => channel.name))];
    const words = `${address} does not answer since ${status.since.slice(11, 19)} UTC: ${status.reason ?? 'no reason known'}. Nothing comes into ${names.join(', ')}.`;
    return [{ code: 'broker-away' as const, subject: `broker ${id}`, words, runId: null, sinceUtcMs: Date.parse(status.since) }];
  });
}

/** A camera is asked at both ends of each swing; what was told longer ago than the longest dwells last is not of now, ms (an estimate, no source). */
const cameraToldMs = 3_600_000;

export function cameraConditions(cameras: readonly Pick<CameraRecord, 'id' | 'name' | 'status'>[], utcMs: number): Condition[] {
  return cameras.flatMap(({ id, name, status }) => {
    if (status === null || status.reason === null) return [];
    const askedUtcMs = Date.parse(status.askedAt);
    if (utcMs - askedUtcMs > cameraToldMs) return [];
    const words = `"${name}" gave no picture: ${status.reason}.`;
    return [{ code: 'camera-away' as const, subject: `camera ${id}`, words, runId: null, sinceUtcMs: askedUtcMs }];
  });
}
