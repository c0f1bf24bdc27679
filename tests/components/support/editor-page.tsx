import { act, fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { EditorScreen } from '@/components/protocols/editor-screen';
import type { Role } from '@/shared/contracts/roles';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { params } from './fake-router';
import { problem, showInLab, startFakeLab, type FakeLab } from './fake-lab';

/** The editor of one protocol before a fake lab with one rig, on fake timers. */

// jsdom has no structuredClone, every browser has; documents are JSON.
globalThis.structuredClone ??= <T,>(value: T): T => JSON.parse(JSON.stringify(value)) as T;

export const protocolPath = '/labs/lab-1/protocols/p1';
export const begun: ProtocolDocument = {
  formatVersion: 1,
  name: 'Two pairs',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    {
      kind: 'repeat',
      times: 2,
      steps: [
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', beat_periods: 2 },
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', beat_periods: 2 },
      ],
    },
  ],
};

const live = {
  condition: 'ready',
  detail: '',
  lastReplyAt: null,
  roundTripMs: null,
  discardedLines: 0,
  positionKnown: true,
  angleDeg: 0,
  moving: false,
  interlockClosed: true,
  supplyPresent: true,
  armKey: true,
  driversOn: true,
};
const rig = {
  ...{ id: 'rig-1', name: 'North bench', revision: 1, link: { kind: 'simulated' }, live },
  ...{ arm: null, arming: null, disarmed: null, locks: [], activeRun: null },
};

export interface EditorPage {
  lab: FakeLab;
  /** What the server holds. */
  stored: () => ProtocolDocument;
  /** Somebody else saves. */
  saveByOther: (document: ProtocolDocument) => void;
}

/** `issued`: the draft that the page begins with is revision 1. */
export async function openEditor(
  role: Role = 'operator',
  document: ProtocolDocument = begun,
  { issued = false } = {},
): Promise<EditorPage> {
  const lab = startFakeLab(role);
  let held = document;
  let version = 1;
  let by = 'Ada Thornfield';
  const view = () => ({
    id: 'p1',
    name: held.name,
    updatedAt: '2031-03-14T08:00:00Z',
    updatedBy: by,
    latestRevision: issued ? 1 : null,
    draftDiffers: !issued || held !== document,
    stepCount: held.steps.length,
    document: held,
    revisions: [],
  });
  lab.on('GET /labs/lab-1/rigs', () => ({ body: { items: [rig] } }));
  lab.on('GET /labs/lab-1/rigs/rig-1', () => ({
    body: { ...rig, document: demoRigWide, massSets: [], signatures: [], position: null },
    etag: '"r1"',
  }));
  lab.on(`GET ${protocolPath}`, () => ({ body: view(), etag: `"${version}"` }));
  lab.on(`PUT ${protocolPath}`, ({ body, headers }) => {
    if (headers.get('if-match') !== `"${version}"`)
      return problem(412, 'edited-meanwhile', `${by} saved this protocol after you opened it.`);
    held = (body as { document: ProtocolDocument }).document;
    version += 1;
    return { body: view(), etag: `"${version}"` };
  });
  params['protocolId'] = 'p1';
  await showInLab(<WhenSignedIn />);
  for (let turn = 0; turn < 8; turn += 1) await act(() => jest.advanceTimersByTimeAsync(10));
  return {
    lab,
    stored: () => held,
    saveByOther: (other) => {
      held = other;
      version += 1;
      by = 'Bram Oakhurst';
    },
  };
}

function WhenSignedIn() {
  return useSession().membership === null ? null : <EditorScreen />;
}

export const row = (path: string) => screen.getByTestId(`step-${path}`);
export const titles = () =>
  [...document.querySelectorAll('[role=treeitem]')].map((each) => (each.getAttribute('aria-label') ?? '').split(',')[0]);
export const tap = (testId: string) => fireEvent.click(screen.getByTestId(testId));
export const key = (name: string, more: object = {}) => fireEvent.keyDown(document.activeElement ?? document.body, { key: name, ...more });

/** Lets the quiet time before a save pass, and the save. */
export async function afterQuiet(): Promise<void> {
  await act(() => jest.advanceTimersByTimeAsync(1000));
}
