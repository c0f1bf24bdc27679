import * as z from 'zod';
import { defineRoute } from './route';
import { intervention, motionFields } from './runs';

/** What lets a run go on: out of a hold, past one that waits, past the rest of a step. */

export const resumeRun = defineRoute({
  ...intervention('resume', { name: 'resumeRun', summary: 'Resume a held run, reviewed', access: 'run.resume' }),
  body: z.strictObject(motionFields),
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'not-armed', 'not-reviewed', 'locked', 'key-reused', 'still-running'],
});
export const withdrawHold = defineRoute({
  ...intervention('withdraw-hold', {
    name: 'withdrawHold',
    summary: 'Withdraw a hold that waits for the end of the dwell: the run goes on after it',
    access: 'run.resume',
  }),
  body: z.strictObject({ tappedAt: motionFields.tappedAt }),
});
export const withdrawFinish = defineRoute({
  ...intervention('withdraw-finish', {
    name: 'withdrawFinish',
    summary: 'Take back that the run ends early: it goes on to the end of its protocol',
    access: 'run.resume',
  }),
  body: z.strictObject({ tappedAt: motionFields.tappedAt }),
});
export const skipStep = defineRoute({
  ...intervention('skip', {
    name: 'skipStep',
    summary: 'Leave out the rest of the dwell, settle or wait that stands, reviewed',
    access: 'run.resume',
  }),
  body: z.strictObject({ ...motionFields, /** Row of the step that was reviewed. */ seq: z.number().int().positive() }),
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'not-armed', 'not-reviewed', 'locked', 'key-reused', 'still-running'],
});
export const confirmPrompt = defineRoute({
  ...intervention('confirm-prompt', {
    name: 'confirmPrompt',
    summary: 'Confirm that what a prompt asks for is done, after the rig was armed again; the run goes on at once',
    access: 'prompt.confirm',
  }),
  body: z.strictObject({ tappedAt: motionFields.tappedAt }),
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'not-armed', 'locked', 'key-reused', 'still-running'],
});
