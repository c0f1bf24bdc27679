import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, RepeatStep, SettleStep, Step, WaitStep } from './document';
import { uIsPlanned } from '../planning/planned-method';
import type { Finding } from './finding';
import { walkSteps } from './step-path';

/** Advice that needs no plan in time: fields that do nothing, a start that is not homed, drivers that stay on, an end that hangs on the result, a u that is not told. */
export function adviseDocument(document: ProtocolDocument, rig: RigDocument): Finding[] {
  return [
    ...withoutEffect(document),
    ...noHome(document),
    ...driversKept(document, rig),
    ...optionalStopping(document),
    ...uNotPlanned(document),
  ];
}

const methodNames = { period: 'the time of swing', acceleration: 'the beginnings of the dwells', modulation: 'the turns' } as const;

/** What the plan says of u(G) is for near minus far by equilibria; of everything else it must say that it says nothing. */
function uNotPlanned(document: ProtocolDocument): Finding[] {
  const { method = 'equilibrium' } = document.evaluation ?? {};
  const rotation = [...walkSteps(document.steps)].find(({ step }) => step.kind === 'rotate');
  const how = 'Rehearse it on the simulated rig and evaluate that: its budget is the u to expect.';
  if (!uIsPlanned(document) && method !== 'equilibrium')
    return [
      {
        code: 'u-not-planned',
        path: 'evaluation.method',
        message: `No u of G by ${methodNames[method]} (${method}) is worked out beforehand. ${how}`,
      },
    ];
  if (rotation?.step.kind !== 'rotate') return [];
  const { turns } = rotation.step;
  return [
    {
      code: 'u-not-planned',
      path: rotation.path,
      message: `What ${turns === 1 ? 'the turn' : `the ${String(turns)} turns`} of this rotation would tell of G (evaluation.method "modulation") is not worked out beforehand; a u beside the plan is that of the near and far dwells alone. ${how}`,
    },
  ];
}

/** Fields that the format allows and that do nothing beside the others. */
function withoutEffect(document: ProtocolDocument): Finding[] {
  return [...walkSteps(document.steps)].flatMap(({ step, path }) =>
    messagesOf(step).map((message) => ({ code: 'no-effect', path, message })),
  );
}

function messagesOf(step: Step): string[] {
  if (step.kind === 'settle') return settleMessages(step);
  if (step.kind === 'wait') return waitMessages(step);
  return step.kind === 'repeat' ? repeatMessages(step) : [];
}

const given = (step: Record<string, unknown>, names: readonly string[]) => names.filter((name) => step[name] !== undefined);

function settleMessages(step: SettleStep): string[] {
  if (step.calmWhen !== undefined) return [];
  return given(step, ['atMost_s', 'otherwise']).map((name) => `${name} goes with calmWhen and does nothing beside for_s. Leave it out.`);
}

function waitMessages(step: WaitStep): string[] {
  if (!('localTime' in step.until)) return [];
  return given(step, ['atMost_s', 'otherwise']).map(
    (name) =>
      `${name} goes with a wait for a channel and does nothing beside localTime. Leave it out; ifPast says what to do when the time is past.`,
  );
}

function repeatMessages(step: RepeatStep): string[] {
  const byU = step.until !== undefined && 'relativeStatisticalU' in step.until;
  return step.atLeast === undefined || byU ? [] : ['atLeast goes with until relativeStatisticalU and does nothing here. Leave it out.'];
}

function noHome({ steps }: ProtocolDocument): Finding[] {
  const first = [...walkSteps(steps)].find(({ step }) => ['home', 'swing', 'kick', 'rotate'].includes(step.kind));
  if (first === undefined || first.step.kind === 'home') return [];
  return [
    {
      code: 'no-home',
      path: first.path,
      message:
        'The sources move here before the protocol has homed them, so it starts only while the controller knows its position. Put a home step first: then every run begins from the same edge.',
    },
  ];
}

function driversKept({ atEnd }: ProtocolDocument, { motion }: RigDocument): Finding[] {
  if (atEnd?.drivers !== 'release' || motion === undefined || motion.safeWhenFree === true) return [];
  return [
    {
      code: 'drivers-kept',
      path: 'atEnd',
      message:
        'The drivers stay on at the end, because this rig is not marked as safe when free (motion.safeWhenFree). Mark it if its turntable cannot move by itself, or leave drivers at "keep".',
    },
  ];
}

/** A series that ends by its own scatter (physics.md L6). The standard deviation of n values is itself known to 1/√(2(n − 1)) (GUM, E.4.3). */
function optionalStopping({ steps }: ProtocolDocument): Finding[] {
  return [...walkSteps(steps)].flatMap(({ step, path }) => {
    if (step.kind !== 'repeat' || step.until === undefined || !('relativeStatisticalU' in step.until)) return [];
    const least = Math.max(2, step.atLeast ?? fewestPasses);
    const known = Math.round(100 / Math.sqrt(2 * (least - 1)));
    return [
      {
        code: 'optional-stopping',
        path,
        message:
          `This repeat ends as soon as u so far comes down to ${(100 * step.until.relativeStatisticalU).toPrecision(2)} %, looked at from ${least} passes on, where u itself is known to ${known} % only: it tends to end where u has come out too small. ` +
          'Where the result is to convince others, fix the number of passes with times.',
      },
    ];
  });
}

/** Default of atLeast. */
const fewestPasses = 20;
