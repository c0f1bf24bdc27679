import { pipeline } from 'node:stream/promises';
import { Readable } from 'node:stream';
import * as contracts from '@/shared/contracts/retention';
import type { KeptChannel, RetentionRuleView } from '@/shared/contracts/retention';
import { summariesHead, summaryLines } from '@/shared/archive/sample-lines';
import { findChannel } from '@/server/store/imports';
import * as store from '@/server/store/retention';
import { summaryPages } from '@/server/store/thinned-summaries';
import { wouldGo } from '@/server/store/thinning';
import { attach, fileWords } from '../attachment';
import { audited } from '../audited';
import { isoOf, isoOrNull } from '../maker';
import { notFound } from '../problem-error';
import { mount } from '../route-context';
import type { Services } from '../services';
import { channelViewOf } from './data';
import { exportWindow, isGone } from './sample-export';

const viewOf = (rule: store.RetentionRule | undefined): RetentionRuleView | null =>
  rule === undefined ? null : { asLab: rule.asLab, keepDays: rule.keepDays, decidedAt: isoOf(rule.decidedAt), decidedBy: rule.decidedBy };

async function keptChannels({ database: { db } }: Services, labId: string, rules: readonly store.RetentionRule[]): Promise<KeptChannel[]> {
  const thinned = await store.thinnedOfLab(db, labId);
  return (await store.channelsWithRig(db, labId)).map(({ channel, rigName }) => {
    const { days, holdsFromUtcMs } = store.keepingOf(rules, channel.id);
    const gone = thinned.get(channel.id);
    return {
      channel: channelViewOf(channel),
      rigName,
      rule: viewOf(rules.find(({ channelId }) => channelId === channel.id)),
      keepDays: days,
      holdsFrom: isoOrNull(holdsFromUtcMs),
      thinned: gone === undefined ? null : { samples: gone.samples, fromAt: isoOf(gone.fromUtcMs), toAt: isoOf(gone.toUtcMs) },
    };
  });
}

/** The channels that a rule holds for: that one, or all that go by the rule of the lab. */
async function channelsUnder({ database: { db } }: Services, labId: string, channelId: string | null) {
  const all = (await store.channelsWithRig(db, labId)).map(({ channel }) => channel);
  if (channelId === null) {
    const own = (await store.rulesOf(db, labId)).filter(({ asLab }) => !asLab).map((rule) => rule.channelId);
    return all.filter(({ id }) => !own.includes(id));
  }
  const one = all.filter(({ id }) => id === channelId);
  if (one.length === 0) throw notFound('channel');
  return one;
}

/** What a rule would take away now, of all that it holds for. */
async function dryRun(services: Services, labId: string, rule: { channelId: string | null; keepDays: number }) {
  const channels = await channelsUnder(services, labId, rule.channelId);
  const cutoffUtcMs = store.cutoffOf(rule.keepDays, services.clock.utcMs());
  const sum = { samples: 0, kept: 0, fromUtcMs: Infinity, toUtcMs: -Infinity };
  for (const { id, rigId } of channels) {
    const found = await wouldGo(services.database, { labId, channelId: id, rigId }, cutoffUtcMs);
    sum.samples += found.samples;
    sum.kept += found.kept;
    sum.fromUtcMs = Math.min(sum.fromUtcMs, found.fromUtcMs ?? Infinity);
    sum.toUtcMs = Math.max(sum.toUtcMs, found.toUtcMs ?? -Infinity);
  }
  const { samples, kept } = sum;
  const none = samples === 0;
  return { samples, kept, fromAt: none ? null : isoOf(sum.fromUtcMs), toAt: none ? null : isoOf(sum.toUtcMs), channels: channels.length };
}

export const retentionRoutes = [
  mount(contracts.getRetention, async ({ membership: { labId }, services }) => {
    const rules = await store.rulesOf(services.database.db, labId);
    return { lab: viewOf(rules.find(({ channelId }) => channelId === null)), channels: await keptChannels(services, labId, rules) };
  }),

  mount(contracts.tryRetention, ({ membership: { labId }, services, query }) =>
    dryRun(services, labId, { channelId: query.channelId ?? null, keepDays: query.keepDays }),
  ),

  mount(contracts.decideRetention, async (context) => {
    const { membership, services, body, me } = context;
    const { labId } = membership;
    const { channelId, keep } = body;
    const [channel] = channelId === null ? [] : await channelsUnder(services, labId, channelId);
    const keepDays = typeof keep === 'number' ? keep : null;
    const would = keepDays === null ? null : await dryRun(services, labId, { channelId, keepDays });
    const about = {
      channelId,
      channel: channel?.name ?? null,
      keep,
      ...(would === null ? {} : { wouldGo: would.samples, wouldStay: would.kept }),
    };
    await audited(context, { kind: 'samples.retention-decided', data: () => about }, (tx) =>
      store.decideRule(tx, {
        ...{ labId, channelId, asLab: keep === 'as-lab', keepDays },
        ...{ decidedAt: services.clock.utcMs(), decidedBy: me.name },
      }),
    );
    return undefined;
  }),

  mount(contracts.exportSummariesCsv, async ({ params, membership: { labId }, services, query, res }) => {
    const channel = await findChannel(services.database.db, labId, params.channelId);
    if (channel === null) throw notFound('channel');
    const window = exportWindow(query);
    attach(res, `evenfall-${fileWords(channel.name, 'channel')}-summaries-${channel.id.slice(0, 8)}.csv`);
    res.type('text/csv');
    const text = async function* () {
      yield summariesHead(channel.unit);
      for await (const page of summaryPages(services.database, { labId, channelId: channel.id }, window)) {
        yield summaryLines(page);
        await services.breathe();
      }
    };
    await pipeline(Readable.from(text()), res).catch((error: unknown) => {
      if (!isGone(error)) throw error;
    });
    return undefined;
  }),
];
