import * as contracts from '@/shared/contracts/step-notes';
import type { StepNoteView } from '@/shared/contracts/step-notes';
import * as store from '@/server/store/step-notes';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { loadRun } from '../run-view';

/** Of one run. */
const mostNotes = 2000;

const viewOf = ({ id, seq, text, writtenAt, writtenBy }: store.StepNoteRecord): StepNoteView => ({
  id,
  seq,
  text,
  at: isoOf(writtenAt),
  by: writtenBy,
});

export const stepNoteRoutes = [
  mount(contracts.listStepNotes, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.stepNotesOf(services.database.db, { labId: run.labId, runId: run.id })).map(viewOf) };
  }),

  mount(contracts.writeStepNote, async (context) => {
    const { params, body, me, membership, services } = context;
    const run = await loadRun(services, membership.labId, params.runId);
    const ofRun = { labId: run.labId, runId: run.id };
    const data = ({ id }: store.StepNoteRecord) => ({ runId: run.id, noteId: id, seq: body.seq, text: body.text });
    const note = await audited(context, { kind: 'run.step-noted', data }, async (tx) => {
      if (!(await store.hasStep(tx, { ...ofRun, seq: body.seq }))) throw notFound('row of the step log');
      if ((await store.countStepNotes(tx, ofRun)) >= mostNotes)
        throw new ProblemError('not-possible-now', `This run has ${String(mostNotes)} notes, and takes no more.`);
      return store.insertStepNote(tx, { ...ofRun, ...body, writtenAt: services.clock.utcMs(), writtenBy: me.name });
    });
    return viewOf(note);
  }),
];
