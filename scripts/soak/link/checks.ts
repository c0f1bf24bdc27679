import { decodeLine } from '@/firmware-protocol/codec';
import type { LinkEvent } from '@/server/interfaces/turntable-link';
import { tagOf } from '@/server/links/command-book';
import { crystal, soakRig, startUtcMs, type Night } from './night';
import type { Situation } from './situations';

/** What must hold on every night; each tells what is wrong, or nothing. They know the controller's truth, not the driver's code. */
type Check = (night: Night, situation: Situation) => string | null;

const TINY = 1e-6;
const LEASE_MS = 2_000;
/** From 30°/s to rest at 60°/s², and a sample. */
const RAMP_MS = 500 + 60;
const MOTIONS = ['one', 'two', 'three', 'four', 'five', 'six'];
const HALTS = ['hold', 'stop'];

const began = ({ did }: Night) => did.flatMap(({ event, atMs }) => (event.what.word === 'began' ? [{ tag: event.what.tag, atMs }] : []));
const halts = ({ arrived }: Night) => arrived.filter(({ request }) => ['hold', 'stop', 'off'].includes(request.order.word));

/** Stretches between two looks in which the table moved. */
function moving({ samples }: Night): { fromMs: number; toMs: number }[] {
  const stretches: { fromMs: number; toMs: number }[] = [];
  for (let index = 1; index < samples.length; index += 1) {
    const [before, now] = [samples[index - 1], samples[index]] as [(typeof samples)[0], (typeof samples)[0]];
    if (Math.abs(now.angleDeg - before.angleDeg) > TINY) stretches.push({ fromMs: before.atMs, toMs: now.atMs });
  }
  return stretches;
}

/** At most one execution of each command, whatever was repeated. */
const atMostOnce: Check = (night) => {
  const tags = began(night).map(({ tag }) => tag);
  const twice = tags.find((tag, index) => tags.indexOf(tag) !== index);
  const strange = tags.find((tag) => !MOTIONS.some((id) => tagOf(id) === tag));
  if (strange !== undefined) return `a motion ${strange} began that nobody of this driver ordered`;
  return twice === undefined ? null : `the motion ${twice} began twice`;
};

/** Each request is carried out at most once, whatever was repeated: what is done a second time is answered with another time of receipt. */
const eachOnce: Check = ({ arrived, replies }) => {
  const words = new Map(arrived.map(({ request }) => [keyOf(request), request.order.word]));
  const receipts = new Map<string, number>();
  for (const { reply } of replies) {
    const { body, receivedUs } = reply;
    const word = words.get(keyOf(reply)) ?? '';
    // Greetings have numbers of their own, stops may be carried out again, and these refusals are of what was not carried out (SPEC 3.7, 9.4).
    if (['', 'hello', 'ident', 'hold', 'stop', 'off'].includes(word)) continue;
    if (body.word === 'no' && ['session', 'epoch', 'old', 'reused'].includes(body.code)) continue;
    if ((receipts.get(keyOf(reply)) ?? receivedUs) !== receivedUs) return `the ${word} ${keyOf(reply)} was carried out twice`;
    receipts.set(keyOf(reply), receivedUs);
  }
  return null;
};

const keyOf = ({ session, number }: { session: string; number: number }) => `${session} ${number}`;

/** What was spoilt on its way is read by nobody, at either end. */
const nothingSpoiltIsRead: Check = ({ line: { written, arrived } }) => {
  const read = arrived.find((line) => !written.has(line) && ['request', 'unusable', 'reply', 'event'].includes(decodeLine(line).kind));
  return read === undefined ? null : `"${read}" was read, and nobody wrote it`;
};

/** No motion is called done that the controller has not acknowledged and ended. */
const doneWhenAcknowledged: Check = (night) => {
  for (const { event, atMs } of night.told) {
    if (event.kind !== 'homed' && !(event.kind === 'motion-ended' && event.cause === 'done')) continue;
    const tag = tagOf(event.commandId);
    const order = night.arrived.find(({ request }) => 'tag' in request.order && request.order.tag === tag);
    const acknowledged = night.replies.some(({ reply, atMs: repliedMs }) => order && isAnswer(reply, order.request) && repliedMs <= atMs);
    const ended = night.did.some(
      ({ event: { what }, atMs: didMs }) => what.word === 'ended' && what.tag === tag && what.cause === 'done' && didMs <= atMs,
    );
    if (!acknowledged || !ended)
      return `"${event.commandId}" was called done at ${atMs} ms, and the controller had not ${acknowledged ? 'ended' : 'acknowledged'} it`;
  }
  return null;
};

/** The controller knows its count: steps that it lost unseen are not its doing. */
const insideLimits: Check = ({ samples, slippedSteps }) => {
  const spareDeg = slippedSteps / soakRig.stepsPerDegree + TINY;
  const out = samples.find(({ angleDeg }) => angleDeg < soakRig.minDeg - spareDeg || angleDeg > soakRig.maxDeg + spareDeg);
  return out === undefined ? null : `at ${out.atMs} ms the table stood at ${out.angleDeg} deg`;
};

/** No motion without a lease that was renewed, a closed interlock and the supply. */
const allowedToMove: Check = (night) => {
  const renewals = night.arrived.flatMap(({ request, atMs }) => (request.order.word === 'renew' ? [atMs] : []));
  for (const { fromMs: atMs, toMs: untilMs } of moving(night)) {
    const last = renewals.findLast((renewedMs) => renewedMs <= untilMs) ?? -Infinity;
    if (atMs > last + LEASE_MS + RAMP_MS) return `at ${atMs} ms the table moved ${(atMs - last).toFixed(0)} ms after the last renewal`;
    for (const { kind, fromMs, toMs } of night.forbidden) {
      if (atMs > fromMs + (kind === 'interlock' ? RAMP_MS : 60) && untilMs < toMs)
        return `at ${atMs} ms the table moved against the ${kind}`;
    }
  }
  return null;
};

/** What was ordered before a stop does not begin after it, and what moves comes to rest. */
const nothingAfterStop: Check = (night) => {
  const begins = began(night);
  for (const { tag, atMs } of begins) {
    const ordered = night.issued.find(({ command }) => tagOf(command.id) === tag)?.atMs ?? Infinity;
    for (const halt of night.issued.filter(({ command }) => HALTS.includes(command.id) && command.id !== tag)) {
      const arrived = halts(night).find(({ request, atMs: haltMs }) => request.order.word === halt.command.kind && haltMs >= halt.atMs);
      if (ordered < halt.atMs && arrived !== undefined && arrived.atMs < atMs)
        return `the motion ${tag} began at ${atMs} ms, after the ${halt.command.kind} of ${arrived.atMs} ms`;
    }
  }
  for (const { fromMs: atMs, toMs } of moving(night)) {
    const halt = halts(night).findLast((one) => one.atMs <= atMs)?.atMs ?? -Infinity;
    const begin = begins.findLast((one) => one.atMs <= toMs)?.atMs ?? -Infinity;
    if (begin < halt && atMs > halt + RAMP_MS) return `at ${atMs} ms the table still moved after the stop of ${halt} ms`;
  }
  return null;
};

/** What waited when an input opened, the supply was lost or the controller restarted does not begin later. */
const cancelled: Check = (night) => {
  for (const { tag, atMs } of began(night)) {
    const accepted = night.arrived.find(({ request, atMs: arrivedMs }) => {
      const { order } = request;
      const isOrder = (order.word === 'move' || order.word === 'home') && order.tag === tag;
      return isOrder && night.replies.some(({ reply, atMs: repliedMs }) => isAnswer(reply, request) && repliedMs === arrivedMs);
    });
    const hazard = night.hazards.find((one) => accepted !== undefined && one.atMs > accepted.atMs && one.atMs < atMs);
    if (hazard !== undefined)
      return `the motion ${tag}, accepted at ${accepted?.atMs} ms, began at ${atMs} ms, after ${hazard.kind} at ${hazard.atMs} ms`;
  }
  return null;
};

const isAnswer = (reply: Night['replies'][0]['reply'], { session, number }: { session: string; number: number }) =>
  reply.session === session && reply.number === number && reply.body.word === 'ok';

/** The reported position is what was counted: where the table truly stands, but for steps that were lost, and those are seen at the home edge. */
const counted: Check = ({ did, slippedSteps }) => {
  for (const { event, trueDeg, atMs } of did) {
    const { what } = event;
    if (what.word !== 'ended' || what.position === null) continue;
    const off = Math.round(what.position - trueDeg * soakRig.stepsPerDegree);
    if (off !== 0 && off !== -slippedSteps) return `at ${atMs} ms position ${what.position} was told, the table stood at ${trueDeg} deg`;
  }
  return null;
};

const toldOf = <K extends LinkEvent['kind']>({ told }: Night, kind: K, commandId: string) =>
  told
    .map(({ event }) => event)
    .filter(
      (event): event is Extract<LinkEvent, { kind: K }> => event.kind === kind && 'commandId' in event && event.commandId === commandId,
    );

/** Every command has exactly one end that is told, every stop is confirmed once, and the link is there again. */
const everythingTold: Check = (night) => {
  if (night.condition !== 'ready') return `the link is ${night.condition} in the end`;
  for (const id of MOTIONS) {
    const count = (['refused', 'motion-ended', 'homed', 'home-failed'] as const).reduce(
      (sum, kind) => sum + toldOf(night, kind, id).length,
      0,
    );
    if (count !== 1) return `the command "${id}" was told to have ended ${count} times`;
  }
  for (const id of HALTS)
    if (toldOf(night, 'standstill', id).length !== 1) return `the ${id} was confirmed ${toldOf(night, 'standstill', id).length} times`;
  return null;
};

/** What is told of a motion is what the controller did, neither less nor more, at its time within the stated uncertainty. */
const toldAsItWas: Check = (night, { restarts }) => {
  if (restarts) return null;
  for (const id of MOTIONS) {
    const did = (word: 'began' | 'ended') => night.did.filter(({ event: { what } }) => what.word === word && what.tag === tagOf(id));
    const ended = [...toldOf(night, 'motion-ended', id), ...toldOf(night, 'homed', id)];
    const counts = [
      [toldOf(night, 'motion-began', id).length, did('began').length],
      [ended.length + toldOf(night, 'home-failed', id).length, did('ended').length],
      [toldOf(night, 'accepted', id).length, did('ended').length],
    ];
    if (counts.some(([told, done]) => told !== done))
      return `of "${id}" was told (began, ended, accepted) ${JSON.stringify(counts)}, told and done`;
    for (const [index, event] of ended.entries()) {
      const truth = did('ended')[index] as Night['did'][0];
      const utcMs = startUtcMs + (truth.event.atUs / 1000 - night.uptimeS * 1000) / (1 + crystal.ratePpm * 1e-6);
      if (Math.abs(event.at.utcMs - utcMs) > 2000 * event.at.uS + 0.01)
        return `the end of "${id}" was told ${event.at.utcMs - utcMs} ms off, with u ${1000 * event.at.uS} ms`;
    }
  }
  return null;
};

export const checks: Readonly<Record<string, Check>> = {
  atMostOnce,
  eachOnce,
  nothingSpoiltIsRead,
  doneWhenAcknowledged,
  insideLimits,
  allowedToMove,
  nothingAfterStop,
  cancelled,
  counted,
  everythingTold,
  toldAsItWas,
};
