import canonicalize from 'canonicalize';
import * as contracts from '@/shared/contracts/protocols';
import type { ProtocolRevision, ProtocolSummary, ProtocolView } from '@/shared/contracts/protocols';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { checkProtocol } from '@/shared/protocol/check';
import type { Step } from '@/shared/protocol/document';
import * as store from '@/server/store/protocols';
import { findRig } from '@/server/store/rigs';
import { audited, enterAudit } from '../audited';
import { isoOf, makerOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { refusalOf } from '../refused-protocol';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';

const countSteps = (steps: readonly Step[]): number =>
  steps.reduce((sum, step) => sum + 1 + (step.kind === 'repeat' ? countSteps(step.steps) : 0), 0);

function summaryOf(protocol: store.ProtocolRecord, latest: { number: number; draftVersion: number } | null): ProtocolSummary {
  return {
    id: protocol.id,
    name: protocol.name,
    updatedAt: isoOf(protocol.updatedAt),
    updatedBy: protocol.updatedBy,
    latestRevision: latest?.number ?? null,
    draftDiffers: latest?.draftVersion !== protocol.version,
    stepCount: countSteps(protocol.document.steps),
  };
}

const revisionSummaryOf = (revision: { number: number; issuedAt: number; issuedBy: string; note: string }) => ({
  number: revision.number,
  issuedAt: isoOf(revision.issuedAt),
  issuedBy: revision.issuedBy,
  note: revision.note,
});

const revisionOf = (revision: store.RevisionRecord): ProtocolRevision => ({
  ...revisionSummaryOf(revision),
  protocolId: revision.protocolId,
  document: revision.document,
  sha256: revision.sha256,
});

async function load(services: Services, labId: string, protocolId: string): Promise<store.ProtocolRecord> {
  const protocol = await store.findProtocol(services.database.db, labId, protocolId);
  if (protocol === null) throw notFound('protocol');
  return protocol;
}

async function viewOf(services: Services, protocol: store.ProtocolRecord): Promise<ProtocolView> {
  const revisions = await store.listRevisions(services.database.db, protocol.labId, protocol.id);
  return { ...summaryOf(protocol, revisions[0] ?? null), document: protocol.document, revisions: revisions.map(revisionSummaryOf) };
}

const versionOf = (protocol: store.ProtocolRecord) => String(protocol.version);

function editedMeanwhile(protocol: store.ProtocolRecord, membership: Membership): ProblemError {
  const at = formatClockWithZone(protocol.updatedAt, { timeZone: membership.timeZone, precision: 'seconds', weekday: true });
  return new ProblemError(
    'edited-meanwhile',
    `${protocol.updatedBy} saved this protocol at ${at}, after you opened it. Compare the two, then save yours over it or take theirs.`,
  );
}

/** An editor saves after each pause of its user: what one person edits without a longer one is one entry. */
const oneEditMs = 15 * 60_000;

function saveDraft(
  context: { me: SignedIn; membership: Membership; services: Services },
  draft: Parameters<typeof store.saveDraft>[1],
  before: store.ProtocolRecord,
): Promise<boolean> {
  const maker = makerOf(context);
  return context.services.database.db.transaction(async (tx) => {
    const saved = await store.saveDraft(tx, draft, maker);
    const goesOn = before.updatedById === maker.userId && maker.at - before.updatedAt < oneEditMs && before.version > 1;
    const data = { protocolId: before.id, name: draft.document.name, fromVersion: before.version };
    if (saved && !goesOn) await enterAudit(tx, context, { kind: 'protocol.edited', data });
    return saved;
  });
}

export const protocolRoutes = [
  mount(contracts.listProtocols, async ({ membership, services }) => {
    const found = await store.listProtocols(services.database.db, membership.labId);
    return { items: found.map(({ protocol, latest }) => summaryOf(protocol, latest)) };
  }),

  mount(contracts.createProtocol, async (context) => {
    const { membership, services, body } = context;
    const entry = { kind: 'protocol.made', data: (protocolId: string) => ({ protocolId, name: body.document.name }) };
    const id = await audited(context, entry, (tx) =>
      store.createProtocol(tx, { labId: membership.labId, document: body.document }, makerOf(context)),
    );
    const protocol = await load(services, membership.labId, id);
    context.setEtag(versionOf(protocol));
    return viewOf(services, protocol);
  }),

  mount(contracts.getProtocol, async ({ params, membership, services, setEtag }) => {
    const protocol = await load(services, membership.labId, params.protocolId);
    setEtag(versionOf(protocol));
    return viewOf(services, protocol);
  }),

  mount(contracts.saveProtocol, async (context) => {
    const { params, membership, services, body, ifMatch } = context;
    const before = await load(services, membership.labId, params.protocolId);
    if (versionOf(before) !== ifMatch) throw editedMeanwhile(before, membership);
    const same = canonicalize(before.document) === canonicalize(body.document);
    const draft = { labId: membership.labId, protocolId: before.id, expectedVersion: before.version, document: body.document };
    const saved = same || (await saveDraft(context, draft, before));
    const after = await load(services, membership.labId, params.protocolId);
    if (!saved) throw editedMeanwhile(after, membership);
    context.setEtag(versionOf(after));
    return viewOf(services, after);
  }),

  mount(contracts.deleteProtocol, async (context) => {
    const { params, membership, services } = context;
    const protocol = await load(services, membership.labId, params.protocolId);
    const entry = { kind: 'protocol.deleted', data: () => ({ protocolId: protocol.id, name: protocol.name }) };
    await audited(context, entry, async (tx) => {
      if (await store.deleteProtocol(tx, membership.labId, protocol.id)) return;
      throw new ProblemError(
        'not-possible-now',
        `${protocol.name} has issued revisions, which runs may refer to; only a protocol that was never issued can be deleted.`,
      );
    });
    return undefined;
  }),

  mount(contracts.issueRevision, async (context) => {
    const { params, membership, services, body, ifMatch } = context;
    const { db } = services.database;
    const protocol = await load(services, membership.labId, params.protocolId);
    if (versionOf(protocol) !== ifMatch) throw editedMeanwhile(protocol, membership);
    const rig = await findRig(db, membership.labId, body.rigId);
    if (rig === null) throw notFound('rig');
    const [latest] = await store.listRevisions(db, membership.labId, protocol.id);
    if (latest?.draftVersion === protocol.version)
      throw new ProblemError(
        'not-possible-now',
        `Nothing has changed since revision ${String(latest.number)} was issued; that revision holds.`,
      );
    const refusal = refusalOf(checkProtocol(protocol.document, rig.document));
    if (refusal !== null) throw refusal;
    const wanted = {
      labId: membership.labId,
      protocolId: protocol.id,
      draftVersion: protocol.version,
      document: protocol.document,
      sha256: services.sha256(canonicalize(protocol.document) ?? ''),
      note: body.note,
      rigId: rig.id,
      rigRevision: rig.revision,
    };
    const entry = {
      kind: 'protocol.issued',
      data: ({ number, sha256 }: store.RevisionRecord) => ({ protocolId: protocol.id, revision: number, sha256 }),
    };
    const revision = await audited(context, entry, async (tx) => {
      const issued = await store.issueRevision(tx, wanted, makerOf(context));
      if (issued === null) throw editedMeanwhile(await load(services, membership.labId, protocol.id), membership);
      return issued;
    });
    context.setEtag(versionOf(protocol));
    return revisionOf(revision);
  }),

  mount(contracts.getRevision, async ({ params, membership, services }) => {
    const number = Number(params.revision);
    const revision = Number.isSafeInteger(number)
      ? await store.findRevision(services.database.db, { labId: membership.labId, protocolId: params.protocolId }, number)
      : null;
    if (revision === null) throw notFound('protocol revision');
    return revisionOf(revision);
  }),
];
