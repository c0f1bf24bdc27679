import { randomUUID } from 'node:crypto';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { ProtocolDocument } from '@/shared/protocol/document';

/** Ids of one lab's things, enough to fill every address of the API. */
export interface Things {
  labId: string;
  rigId: string;
  massSetId: string;
  protocolId: string;
  protocolEtag: string;
  runId: string;
  channelId: string;
  importId: string;
  evaluationId: string;
  invitationId: string;
  userId: string;
}

export interface Row {
  params?: (things: Things) => Record<string, string>;
  query?: (things: Things) => Record<string, string>;
  body?: (things: Things) => unknown;
  raw?: string;
  ifMatch?: (things: Things) => string;
  /** Status for whoever may: the answer to a harmless request, which may well be a refusal by the state of things. */
  allowed: number;
}

export const shortProtocol = (name: string): ProtocolDocument => ({
  formatVersion: 1,
  name,
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 60 },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 60 },
  ],
});

const topic = (name: string) => ({
  ...{ filter: 'lab/air', valuePath: null, time: null, timeUS: 1 },
  channel: { name, role: 'environment', unit: 'degC', rateHz: 1 },
});
const mapping = { delimiter: ',', decimal: '.', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'urad' } as const;

const lab = ({ labId }: Things) => ({ labId });
const rig = ({ labId, rigId }: Things) => ({ labId, rigId });
const run = ({ labId, runId }: Things) => ({ labId, runId });
const channel = ({ labId, channelId }: Things) => ({ labId, channelId });
const protocol = ({ labId, protocolId }: Things) => ({ labId, protocolId });
const file = ({ labId, importId }: Things) => ({ labId, importId });
const nobody = randomUUID();
const alarm = ({ labId }: Things) => ({ labId, alarmId: nobody });
const tapped = { tappedAt: '2031-02-14T20:00:00Z', reviewToken: 'none' };

/** One row for every route of the API; a route without a row fails the test of the matrix. */
export const rows: Readonly<Record<string, Row>> = {
  getHealth: { allowed: 200 },
  getOpenApi: { allowed: 200 },
  getProtocolSchema: { allowed: 200 },
  signIn: { body: () => ({ email: 'nobody@quillfen.example', password: 'not the right one' }), allowed: 401 },
  getMe: { allowed: 200 },
  signOut: { allowed: 204 },
  requestPasswordReset: { body: () => ({ email: 'nobody@quillfen.example' }), allowed: 202 },
  completePasswordReset: { body: () => ({ token: 'none', password: 'quartz lantern moss seven' }), allowed: 404 },
  getInvitation: { params: () => ({ token: 'none' }), allowed: 404 },
  acceptInvitation: { params: () => ({ token: 'none' }), body: () => ({ password: 'quartz lantern moss seven' }), allowed: 404 },
  getLab: { params: lab, allowed: 200 },
  changeLab: { params: lab, body: () => ({}), allowed: 200 },
  listMembers: { params: lab, allowed: 200 },
  invite: { params: lab, body: () => ({ email: `${randomUUID()}@quillfen.example`, role: 'viewer' }), allowed: 201 },
  withdrawInvitation: { params: ({ labId }) => ({ labId, invitationId: nobody }), allowed: 404 },
  changeMemberRole: { params: ({ labId }) => ({ labId, userId: nobody }), body: () => ({ role: 'viewer' }), allowed: 404 },
  removeMember: { params: ({ labId }) => ({ labId, userId: nobody }), allowed: 404 },
  listAudit: { params: lab, query: () => ({ kind: 'run', who: nobody, from: '2031-01-01', until: '2031-12-31' }), allowed: 200 },
  checkAudit: { params: lab, allowed: 200 },
  listRigs: { params: lab, allowed: 200 },
  createRig: {
    params: lab,
    body: () => ({ name: 'Another bench', document: demoRigWide, link: { kind: 'serial', path: '/dev/null' } }),
    allowed: 201,
  },
  getRig: { params: rig, allowed: 200 },
  reviseRig: {
    params: rig,
    body: () => ({ name: 'North bench', document: demoRigWide, reason: 'again' }),
    ifMatch: () => '"77"',
    allowed: 412,
  },
  listRigRevisions: { params: rig, allowed: 200 },
  changeLink: { params: rig, body: () => ({ kind: 'serial', path: '/dev/null' }), ifMatch: () => '"77"', allowed: 412 },
  tryLink: { params: rig, body: () => ({ kind: 'simulated' }), allowed: 200 },
  arm: { params: rig, body: () => ({ name: 'Somebody', until: '2020-01-01T00:00:00Z' }), allowed: 400 },
  disarm: { params: rig, allowed: 404 },
  signCautions: { params: rig, body: () => ({ version: 999 }), allowed: 412 },
  setLock: { params: rig, body: () => ({}), allowed: 201 },
  liftLock: { params: (things) => ({ ...rig(things), lockId: nobody }), body: () => ({ handsOut: true }), allowed: 404 },
  overrideLock: { params: (things) => ({ ...rig(things), lockId: nobody }), body: () => ({ reason: 'gone home' }), allowed: 404 },
  turnVirtual: { params: rig, body: () => ({ armKey: 'on' }), allowed: 204 },
  addMassSet: { params: rig, body: () => ({ label: `Set ${randomUUID()}`, sources: demoRigWide.sources }), allowed: 201 },
  startChecks: { params: rig, query: ({ protocolId }) => ({ protocolId, revision: '1' }), allowed: 200 },
  liveLine: { params: rig, allowed: 200 },
  listSerialPorts: { params: lab, allowed: 200 },
  beginGuided: { params: rig, body: () => ({ atTheRig: true }), allowed: 409 },
  endGuided: { params: rig, body: () => ({ guidedId: nobody }), allowed: 204 },
  stayGuided: { params: rig, body: () => ({ guidedId: nobody, beat: 0 }), allowed: 409 },
  nudge: { params: rig, body: () => ({ guidedId: nobody, steps: 1, tappedAt: tapped.tappedAt }), allowed: 409 },
  homeByHand: { params: rig, body: () => ({ guidedId: nobody, tappedAt: tapped.tappedAt }), allowed: 409 },
  teachLimits: { params: rig, body: () => ({ guidedId: nobody, tappedAt: tapped.tappedAt }), ifMatch: () => '"77"', allowed: 409 },
  takeController: { params: rig, body: () => ({ keptOutBy: 7 }), allowed: 409 },
  holdRig: { params: rig, body: () => ({}), allowed: 202 },
  stopRig: { params: rig, body: () => ({}), allowed: 202 },
  listProtocols: { params: lab, allowed: 200 },
  createProtocol: { params: lab, body: () => ({ document: shortProtocol('Made in passing') }), allowed: 201 },
  getProtocol: { params: protocol, allowed: 200 },
  saveProtocol: { params: protocol, body: () => ({ document: shortProtocol('Not saved') }), ifMatch: () => '"77"', allowed: 412 },
  deleteProtocol: { params: protocol, allowed: 409 },
  issueRevision: { params: protocol, body: ({ rigId }) => ({ rigId }), ifMatch: ({ protocolEtag }) => protocolEtag, allowed: 409 },
  getRevision: { params: (things) => ({ ...protocol(things), revision: '1' }), allowed: 200 },
  listRuns: { params: lab, allowed: 200 },
  startRun: {
    params: lab,
    body: ({ rigId, protocolId, massSetId }) => ({ rigId, protocolId, revision: 1, massSetId, ...tapped }),
    allowed: 409,
  },
  rehearse: { params: lab, body: ({ rigId, protocolId }) => ({ rigId, protocolId, revision: 1 }), allowed: 202 },
  getRun: { params: run, allowed: 200 },
  holdRun: { params: run, body: () => ({}), allowed: 409 },
  holdAfterDwell: { params: run, body: () => ({}), allowed: 409 },
  finishEarly: { params: run, body: () => ({}), allowed: 409 },
  withdrawFinish: { params: run, body: () => ({ tappedAt: tapped.tappedAt }), allowed: 409 },
  withdrawHold: { params: run, body: () => ({ tappedAt: tapped.tappedAt }), allowed: 409 },
  resumeRun: { params: run, body: () => tapped, allowed: 409 },
  skipStep: { params: run, body: () => ({ ...tapped, seq: 1 }), allowed: 409 },
  confirmPrompt: { params: run, body: () => ({ tappedAt: tapped.tappedAt }), allowed: 409 },
  reviewStart: { params: rig, body: ({ protocolId, massSetId }) => ({ protocolId, revision: 1, massSetId }), allowed: 201 },
  reviewResume: { params: run, allowed: 409 },
  reviewSkip: { params: run, body: () => ({ seq: 1 }), allowed: 409 },
  stopRun: { params: run, body: () => ({}), allowed: 409 },
  liveRun: { params: run, allowed: 200 },
  listSteps: { params: run, allowed: 200 },
  stepsCsv: { params: run, allowed: 200 },
  stepsJson: { params: run, allowed: 200 },
  listEvents: { params: run, allowed: 200 },
  listRunAlarms: { params: run, allowed: 200 },
  downloadArchive: { params: run, allowed: 200 },
  readMorning: { params: run, allowed: 200 },
  listSchedules: { params: lab, allowed: 200 },
  makeSchedule: {
    params: lab,
    body: ({ rigId, protocolId, massSetId }) => ({
      ...{ rigId, protocolId, massSetId, revision: 1 },
      plan: { kind: 'once', date: '2001-01-01', time: '22:00' },
    }),
    allowed: 409,
  },
  changeSchedule: { params: ({ labId }) => ({ labId, scheduleId: nobody }), body: () => ({ state: 'paused' }), allowed: 404 },
  skipStart: {
    params: ({ labId }) => ({ labId, scheduleId: nobody }),
    body: () => ({ dueAt: '2031-02-14T21:00:00Z', skipped: true }),
    allowed: 404,
  },
  readCalendar: { params: lab, query: () => ({ from: '2031-02-01T00:00:00Z', until: '2031-03-01T00:00:00Z' }), allowed: 200 },
  readRoomHours: { params: rig, allowed: 200 },
  changeRoomHours: { params: rig, body: () => ({ nightWindow: null, blackouts: [] }), allowed: 200 },
  readFeedState: { params: lab, allowed: 200 },
  makeFeed: { params: lab, allowed: 201 },
  endFeed: { params: lab, allowed: 204 },
  calendarFeed: { params: () => ({ token: 'none' }), allowed: 404 },
  readDoor: { params: rig, allowed: 200 },
  makeDoor: { params: rig, body: () => ({ ring: 'the desk, 204' }), allowed: 200 },
  endDoor: { params: rig, allowed: 204 },
  doorCard: { params: () => ({ token: 'none' }), allowed: 404 },
  listChannels: { params: rig, allowed: 200 },
  beginImport: { params: run, body: () => ({ fileName: 'deflection.csv' }), allowed: 201 },
  putImportContent: { params: file, raw: 'time_utc,deflection_urad\n2031-02-14T20:00:00Z,1\n2031-02-14T20:00:01Z,2\n', allowed: 200 },
  listImports: { params: run, allowed: 200 },
  getImport: { params: file, allowed: 200 },
  cancelImport: { params: ({ labId }) => ({ labId, importId: nobody }), allowed: 404 },
  patchImportContent: { params: file, query: () => ({ offset: '0' }), raw: 'x', allowed: 409 },
  getImportOriginal: { params: file, allowed: 200 },
  listImportMappings: { params: rig, allowed: 200 },
  checkImport: { params: file, body: () => ({ mapping, channelName: 'readout' }), allowed: 200 },
  commitImport: { params: file, body: () => ({ mapping: { ...mapping, valueColumn: 0 }, channelName: 'readout' }), allowed: 400 },
  readSamples: { params: run, allowed: 200 },
  exportSamplesCsv: { params: channel, query: () => ({ fromUtcMs: '5', toUtcMs: '4' }), allowed: 400 },
  exportSamplesNdjson: { params: channel, allowed: 200 },
  exportSummariesCsv: { params: channel, query: () => ({ fromUtcMs: '5', toUtcMs: '4' }), allowed: 400 },
  getRetention: { params: lab, allowed: 200 },
  tryRetention: { params: lab, query: () => ({ keepDays: '30' }), allowed: 200 },
  decideRetention: { params: lab, body: () => ({ channelId: null, keep: 'for-ever' }), allowed: 204 },
  listDevices: { params: rig, allowed: 200 },
  makeDeviceToken: {
    params: rig,
    body: () => ({ name: 'Tracker', channels: [{ name: `spot ${randomUUID()}`, role: 'deflection', unit: 'mm', rateHz: 10 }] }),
    allowed: 201,
  },
  revokeDeviceToken: { params: (things) => ({ ...rig(things), tokenId: nobody }), allowed: 404 },
  listBrokers: { params: rig, allowed: 200 },
  addBroker: {
    params: rig,
    // The discard port, where nothing listens.
    body: () => ({ address: 'mqtt://127.0.0.1:9', userName: null, password: null, topics: [topic(randomUUID())] }),
    allowed: 201,
  },
  reviseBroker: {
    params: (things) => ({ ...rig(things), brokerId: nobody }),
    body: () => ({ address: 'mqtt://127.0.0.1:9', topics: [topic(randomUUID())], signIn: 'as-before' }),
    allowed: 404,
  },
  removeBroker: { params: (things) => ({ ...rig(things), brokerId: nobody }), allowed: 404 },
  listCalibrations: { params: rig, allowed: 200 },
  addCalibration: {
    params: rig,
    body: () => ({ channelId: nobody, calibration: { offset: 0, slope: 1, uOffset: 0, uSlope: 0.001, covariance: 0 }, note: 'x' }),
    allowed: 404,
  },
  listCameras: { params: rig, allowed: 200 },
  addCamera: {
    params: rig,
    body: () => ({ kind: 'address', name: 'x', address: 'http://camera.nowhere:80/picture.jpg', userName: null, password: null }),
    allowed: 400,
  },
  removeCamera: { params: (things) => ({ ...rig(things), cameraId: nobody }), allowed: 404 },
  getCameraPicture: { params: (things) => ({ ...rig(things), cameraId: nobody }), allowed: 404 },
  listFrames: { params: run, allowed: 200 },
  getFramePicture: { params: (things) => ({ ...run(things), frameId: nobody }), allowed: 404 },
  appendSamples: { raw: '{"time_utc": "2031-02-14T20:00:00Z", "value": 1}', allowed: 401 },
  sendCameraPicture: { raw: 'no picture', allowed: 401 },
  listExclusions: { params: run, allowed: 200 },
  makeExclusion: { params: run, body: () => ({ startUtcMs: 2, endUtcMs: 1, reason: 'the door was open' }), allowed: 400 },
  withdrawExclusion: {
    params: ({ labId }) => ({ labId, exclusionId: nobody }),
    body: () => ({ reason: 'the door was shut' }),
    allowed: 404,
  },
  listStepNotes: { params: run, allowed: 200 },
  writeStepNote: { params: run, body: () => ({ seq: 999_999, text: 'a lorry' }), allowed: 404 },
  startEvaluation: { params: run, body: () => ({ channel: 'no such channel' }), allowed: 422 },
  listEvaluations: { params: run, allowed: 200 },
  listGivenUpJobs: { params: lab, allowed: 200 },
  retryJob: { params: ({ labId }) => ({ labId, jobId: nobody }), allowed: 404 },
  listAlarms: { params: lab, allowed: 200 },
  getAlarm: { params: alarm, allowed: 404 },
  acknowledgeAlarm: { params: alarm, allowed: 404 },
  confirmAlarm: { params: alarm, body: () => ({ note: 'looked at the belt' }), allowed: 404 },
  resetAlarm: { params: alarm, allowed: 404 },
  shelveAlarm: { params: alarm, body: () => ({ forMin: 30, reason: 'the painters are in' }), allowed: 404 },
  unshelveAlarm: { params: alarm, allowed: 404 },
  takeAlarmOut: { params: alarm, body: () => ({ reason: 'the sensor is away' }), allowed: 404 },
  returnAlarm: { params: alarm, allowed: 404 },
  listAlarmHistory: { params: lab, allowed: 200 },
  countAlarms: { params: lab, allowed: 200 },
  listChannelLimits: { params: rig, allowed: 200 },
  addChannelLimit: { params: rig, body: () => ({ channelId: nobody, limit: { kind: 'silence', atMostS: 60 } }), allowed: 404 },
  removeChannelLimit: { params: (things) => ({ ...rig(things), limitId: nobody }), allowed: 404 },
  getOnCall: { params: lab, allowed: 200 },
  changeOnCall: { params: lab, body: () => ({ order: [] }), allowed: 200 },
  changeOwnCall: { params: lab, body: () => ({ doNotRing: { from: '22:00', until: '06:00' } }), allowed: 200 },
  tryCall: { params: lab, allowed: 200 },
  getWatcher: { params: lab, allowed: 200 },
  changeWatcher: { params: lab, body: () => ({ url: null }), allowed: 200 },
  getPushKey: { allowed: 200 },
  listPushDevices: { allowed: 200 },
  addPushDevice: {
    body: () => ({ endpoint: 'http://127.0.0.1/push', keys: { p256dh: 'B'.repeat(87), auth: 'A'.repeat(22) }, device: 'A browser' }),
    allowed: 400,
  },
  removePushDevice: { params: () => ({ deviceId: nobody }), allowed: 404 },
  freezeEvaluation: { params: ({ labId }) => ({ labId, evaluationId: nobody }), body: () => ({ reason: 'for the paper' }), allowed: 404 },
  recomputeEvaluation: { params: ({ labId, evaluationId }) => ({ labId, evaluationId }), allowed: 409 },
  downloadReport: { params: ({ labId, evaluationId }) => ({ labId, evaluationId }), allowed: 409 },
  getEvaluation: { params: ({ labId, evaluationId }) => ({ labId, evaluationId }), allowed: 200 },
};
