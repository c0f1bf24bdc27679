import * as contracts from '@/shared/contracts/alarms';
import type { AlarmView, ChannelLimitView } from '@/shared/contracts/alarms';
import type { AlarmEvent, AlarmRefusal } from '@/shared/alarms/machine';
import * as store from '@/server/store/alarms';
import * as read from '@/server/store/alarms-read';
import { hopsOfAlarm } from '@/server/store/calls';
import { addLimit, limitsOfRig, removeLimit, type LimitRecord } from '@/server/store/channel-limits';
import { channelsOfRig } from '@/server/store/imports';
import { allRigNames, findRig } from '@/server/store/rigs';
import { alarmViewOf, historyViewOf, hopViewOf } from '../alarm-view';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { decodeCursor, pageFrom } from '../paging';
import { notFound, ProblemError } from '../problem-error';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';
import { alarmsOfRun } from '../run-alarms';
import { loadRun } from '../run-view';
import { subjectOfLimit } from '../work/channel-conditions';

const dayMs = 86_400_000;
const countedDays = 7;

const refusals: Record<AlarmRefusal, string> = {
  'nothing-to-acknowledge': 'There is nothing to acknowledge: somebody did so already, or the alarm is over.',
  'not-acknowledged': 'Acknowledge the alarm first; then say what was done.',
  'not-latched': 'The alarm is not latched: there is nothing to reset.',
  'still-active': 'Its condition still holds. Reset the alarm when it is away.',
  'shelved-too-long': 'This alarm may not be shelved for so long.',
  'shelved-already': 'The alarm is shelved already.',
  'not-shelved': 'The alarm is not shelved.',
  'out-of-service-already': 'The alarm is out of service already.',
  'in-service-already': 'The alarm is in service.',
};

interface ActContext {
  me: SignedIn;
  membership: Membership;
  services: Services;
  params: { alarmId: string };
}

type Act = Extract<AlarmEvent, { by: string }>;
type WithoutWho<E> = E extends Act ? Omit<E, 'by' | 'utcMs'> : never;

/** Does what a person asks for with an alarm, and enters it into the audit chain. */
async function act(context: ActContext, wanted: WithoutWho<Act>): Promise<AlarmView> {
  const { me, membership, services, params } = context;
  const event = { ...wanted, by: me.name, utcMs: services.clock.utcMs() } as Act;
  const { type, ...data } = wanted;
  const entry = { kind: `alarm.${type}`, data: () => ({ alarmId: params.alarmId, ...data }) };
  const alarm = await audited(context, entry, async (tx) => {
    const outcome = await store.actOnAlarm(tx, { labId: membership.labId, alarmId: params.alarmId }, event);
    if (outcome === null) throw notFound('alarm');
    if (!outcome.ok) throw new ProblemError('not-possible-now', refusals[outcome.refusal]);
    return outcome.alarm;
  });
  services.pokeJobs();
  return alarmViewOf(alarm, await allRigNames(services.database.db, membership.labId));
}

async function load(services: Services, labId: string, alarmId: string): Promise<store.AlarmRecord> {
  const alarm = await read.findAlarm(services.database.db, labId, alarmId);
  if (alarm === null) throw notFound('alarm');
  return alarm;
}

const reading = [
  mount(contracts.listAlarms, async ({ membership, services }) => {
    const { db } = services.database;
    const names = await allRigNames(db, membership.labId);
    const items = (await read.standingAlarms(db, membership.labId)).map((alarm) => alarmViewOf(alarm, names));
    return { items, serverAt: isoOf(services.clock.utcMs()) };
  }),

  mount(contracts.getAlarm, async ({ params, membership, services }) => {
    const { db } = services.database;
    const alarm = await load(services, membership.labId, params.alarmId);
    const names = await allRigNames(db, membership.labId);
    const page = { labId: membership.labId, alarmId: alarm.id, beforeSeq: null, limit: 100 };
    return {
      alarm: alarmViewOf(alarm, names),
      history: (await read.alarmHistoryPage(db, page)).map((row) => historyViewOf(row, names)),
      hops: (await hopsOfAlarm(db, membership.labId, alarm.id)).map(hopViewOf),
    };
  }),

  mount(contracts.listAlarmHistory, async ({ membership, query, services }) => {
    const { db } = services.database;
    const [beforeSeq] = decodeCursor(query.cursor, ['number']) ?? [null];
    const names = await allRigNames(db, membership.labId);
    const rows = await read.alarmHistoryPage(db, { labId: membership.labId, alarmId: null, beforeSeq, limit: query.limit + 1 });
    const page = pageFrom(rows, query.limit, (row) => [row.seq]);
    return { items: page.items.map((row) => historyViewOf(row, names)), next: page.next };
  }),

  mount(contracts.countAlarms, async ({ membership, services }) => {
    const sinceUtcMs = services.clock.utcMs() - countedDays * dayMs;
    const counts = await read.alarmCounts(services.database.db, membership.labId, sinceUtcMs);
    const items = counts.map(({ code, count }) => ({
      code,
      title: store.kindOf(code).title,
      priority: store.kindOf(code).priority,
      count,
    }));
    return { days: countedDays, items };
  }),
];

const acting = [
  mount(contracts.acknowledgeAlarm, (context) => act(context, { type: 'acknowledge' })),
  mount(contracts.confirmAlarm, (context) => act(context, { type: 'confirm', note: context.body.note })),
  mount(contracts.resetAlarm, (context) => act(context, { type: 'reset' })),
  mount(contracts.shelveAlarm, async (context) => {
    const { body, params, membership, services } = context;
    const { shelveAtMostMin } = store.kindOf((await load(services, membership.labId, params.alarmId)).code);
    if (body.forMin > shelveAtMostMin)
      throw new ProblemError('invalid-input', `This alarm may be shelved for ${String(shelveAtMostMin)} min at most.`, [
        { path: 'forMin', message: `at most ${String(shelveAtMostMin)} min` },
      ]);
    const untilUtcMs = services.clock.utcMs() + body.forMin * 60_000;
    return act(context, { type: 'shelve', reason: body.reason, untilUtcMs, oneShot: body.oneShot });
  }),
  mount(contracts.unshelveAlarm, (context) => act(context, { type: 'unshelve' })),
  mount(contracts.takeAlarmOut, (context) => act(context, { type: 'take-out', reason: context.body.reason })),
  mount(contracts.returnAlarm, (context) => act(context, { type: 'return-to-service' })),
];

const ofRuns = [
  mount(contracts.listRunAlarms, async ({ params, membership, services }) => ({
    items: await alarmsOfRun(services, await loadRun(services, membership.labId, params.runId)),
  })),
];

const limitViewOf = ({ id, channelId, channelName, unit, limit, changedAt, changedBy }: LimitRecord): ChannelLimitView => ({
  ...{ id, channelId, channelName, unit, limit, changedBy },
  changedAt: isoOf(changedAt),
});

async function assertRig(services: Services, labId: string, rigId: string): Promise<void> {
  if ((await findRig(services.database.db, labId, rigId)) === null) throw notFound('rig');
}

const limits = [
  mount(contracts.listChannelLimits, async ({ params, membership, services }) => {
    await assertRig(services, membership.labId, params.rigId);
    return { items: (await limitsOfRig(services.database.db, membership.labId, params.rigId)).map(limitViewOf) };
  }),

  mount(contracts.addChannelLimit, async (context) => {
    const { params, membership, services, body, me } = context;
    const { db } = services.database;
    await assertRig(services, membership.labId, params.rigId);
    const channel = (await channelsOfRig(db, membership.labId, params.rigId)).find(({ id }) => id === body.channelId);
    if (channel === undefined || channel.runId !== null) throw notFound('channel of this rig');
    const limit = { labId: membership.labId, ...body, changedAt: services.clock.utcMs(), changedBy: me.name };
    const data = () => ({ rigId: params.rigId, channel: channel.name, limit: body.limit });
    const id = await audited(context, { kind: 'rig.channel-limit-set', data }, (tx) => addLimit(tx, limit));
    const [made] = (await limitsOfRig(db, membership.labId, params.rigId)).filter((one) => one.id === id);
    if (made === undefined) throw new Error('the new limit was not found');
    return limitViewOf(made);
  }),

  mount(contracts.removeChannelLimit, async (context) => {
    const { params, membership, services } = context;
    const { labId } = membership;
    await assertRig(services, labId, params.rigId);
    const data = () => ({ rigId: params.rigId, limitId: params.limitId });
    await audited(context, { kind: 'rig.channel-limit-removed', data }, async (tx) => {
      if (!(await removeLimit(tx, { labId, rigId: params.rigId, limitId: params.limitId }))) throw notFound('limit of a channel');
      const found = { met: false, words: '', runId: null, utcMs: services.clock.utcMs() };
      for (const code of ['channel-level', 'channel-slope', 'channel-silent'] as const)
        await store.reportCondition(tx, { labId, rigId: params.rigId, code, subject: subjectOfLimit(params.limitId) }, found);
    });
    return undefined;
  }),
];

export const alarmRoutes = [...reading, ...ofRuns, ...acting, ...limits];
