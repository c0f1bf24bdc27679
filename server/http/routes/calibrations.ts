import * as contracts from '@/shared/contracts/calibrations';
import type { CalibrationView } from '@/shared/contracts/calibrations';
import { calibrationFault } from '@/shared/statistics/calibration';
import * as store from '@/server/store/calibrations';
import { findChannel, type ChannelRecord } from '@/server/store/imports';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { assertRig } from './devices';

const viewOf = (channel: ChannelRecord, row: store.CalibrationRecord): CalibrationView => {
  const { revision, validFrom, offset, slope, uOffset, uSlope, covariance, note, madeAt, madeBy } = row;
  return {
    ...{ channelId: channel.id, channelName: channel.name, unit: channel.unit, revision, validFrom: isoOf(validFrom) },
    ...{ calibration: { offset, slope, uOffset, uSlope, covariance }, note, madeAt: isoOf(madeAt), madeBy },
  };
};

export const calibrationRoutes = [
  mount(contracts.listCalibrations, async ({ params, membership: { labId }, services }) => {
    const rig = { labId, rigId: params.rigId };
    await assertRig(services, rig);
    const found = await store.calibrationsOfRig(services.database.db, rig);
    return { items: found.map(({ channel, calibration }) => viewOf(channel, calibration)) };
  }),

  mount(contracts.addCalibration, async (context) => {
    const { params, membership, services, body, me } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const channel = await findChannel(services.database.db, rig.labId, body.channelId);
    if (channel === null || channel.rigId !== rig.rigId) throw notFound('channel');
    const { calibration, note } = body;
    const fault = calibrationFault(calibration);
    if (fault !== null) throw new ProblemError('invalid-input', fault, [{ path: 'calibration', message: fault }]);
    const madeAt = services.clock.utcMs();
    const validFrom = body.validFrom === undefined ? madeAt : Date.parse(body.validFrom);
    const entry = {
      kind: 'channel.calibrated',
      data: ({ revision }: store.CalibrationRecord) => ({
        ...{ rigId: rig.rigId, channelId: channel.id, channel: channel.name, revision, ...calibration, validFrom: isoOf(validFrom), note },
      }),
    };
    const made = await audited(context, entry, (tx) =>
      store.addCalibration(tx, { labId: rig.labId, channelId: channel.id, validFrom, ...calibration, note, madeAt, madeBy: me.name }),
    );
    return viewOf(channel, made);
  }),
];
