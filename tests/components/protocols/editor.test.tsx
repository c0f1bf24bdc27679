import { act, fireEvent, screen } from '@testing-library/react';
import { afterQuiet, begun, key, openEditor, protocolPath, row, tap, titles } from '../support/editor-page';
import { problem } from '../support/fake-lab';

beforeEach(() => {
  window.localStorage.clear();
  jest.useFakeTimers();
});
afterEach(() => jest.useRealTimers());

test('a draft that was changed since its revision is offered to be issued, also once it is saved, and never the start of what it was', async () => {
  await openEditor('operator', begun, { issued: true });
  expect(screen.queryByTestId('issue')).toBeNull();
  fireEvent.click(row('1'));
  tap('move-down');
  await afterQuiet();
  expect(screen.getByTestId('issue').textContent).toBe('Issue rev 2');
  expect(screen.queryByText('Start')).toBeNull();
});

describe('by touch', () => {
  test('a step is taken in hand, moved, duplicated, deleted, and each is undone', async () => {
    await openEditor();
    expect(titles()).toEqual([
      '1. Home',
      '2. Swing to near',
      '3. Repeat 2 times',
      '3.1. Swing to far',
      '3.2. Dwell',
      '3.3. Swing to near',
      '3.4. Dwell',
    ]);
    fireEvent.click(row('1'));
    tap('move-down');
    expect(titles().slice(0, 2)).toEqual(['1. Swing to near', '2. Home']);
    tap('duplicate');
    expect(titles().slice(0, 3)).toEqual(['1. Swing to near', '2. Home', '3. Home']);
    tap('delete');
    tap('undo');
    tap('undo');
    tap('undo');
    expect(titles()[0]).toBe('1. Home');
    tap('redo');
    expect(titles()[0]).toBe('1. Swing to near');
  });

  test('a step goes into a repeat and out again', async () => {
    await openEditor();
    fireEvent.click(row('2'));
    tap('nest');
    expect(titles().slice(1, 3)).toEqual(['2. Repeat 2 times', '2.1. Swing to near']);
    tap('unnest');
    expect(titles()[1]).toBe('2. Swing to near');
  });

  test('a new step comes after the one in hand; a new repeat brings a pair', async () => {
    await openEditor();
    fireEvent.click(row('2'));
    tap('add-step');
    tap('add-repeat');
    expect(titles().slice(2, 7)).toEqual(['3. Repeat 8 times', '3.1. Swing to far', '3.2. Dwell', '3.3. Swing to near', '3.4. Dwell']);
    expect(screen.queryByTestId('add-step-sheet')).toBeNull();
  });

  test('the second tap opens the details, and a changed length shows in the finish time', async () => {
    await openEditor();
    const before = screen.getByTestId('total-time').textContent;
    fireEvent.click(row('3'));
    fireEvent.click(row('3'));
    fireEvent.change(screen.getByTestId('repeat-times'), { target: { value: '20' } });
    expect(titles()[2]).toBe('3. Repeat 20 times');
    await act(() => jest.advanceTimersByTimeAsync(0));
    expect(screen.getByTestId('total-time').textContent).not.toBe(before);
  });

  test('a number that is none stays in its field with the reason, and the document keeps the last good one', async () => {
    await openEditor();
    fireEvent.click(row('3'));
    fireEvent.click(row('3'));
    fireEvent.change(screen.getByTestId('repeat-times'), { target: { value: '2.5' } });
    expect(screen.getByTestId('repeat-times')).toHaveProperty('value', '2.5');
    expect(screen.getByText('a whole number from 1')).toBeTruthy();
    expect(titles()[2]).toBe('3. Repeat 2 times');
  });
});

describe('by keyboard', () => {
  test('arrows choose, Alt and arrows move, Delete deletes, Ctrl+Z brings it back', async () => {
    await openEditor();
    act(() => row('1').focus());
    key('ArrowDown');
    key('ArrowDown');
    expect(document.activeElement).toBe(row('2'));
    key('ArrowUp', { altKey: true });
    expect(titles().slice(0, 2)).toEqual(['1. Swing to near', '2. Home']);
    expect(document.activeElement).toBe(row('1'));
    key('Delete');
    expect(titles()[0]).toBe('1. Home');
    key('z', { ctrlKey: true });
    expect(titles()[0]).toBe('1. Swing to near');
    key('z', { ctrlKey: true });
    expect(titles()[0]).toBe('1. Home');
    key('Z', { ctrlKey: true, shiftKey: true });
    expect(titles()[0]).toBe('1. Swing to near');
  });

  test('Enter opens the details of the step', async () => {
    await openEditor();
    act(() => row('1').focus());
    key('ArrowDown');
    key('Enter');
    expect(screen.getByTestId('step-sheet')).toBeTruthy();
  });
});

describe('saving', () => {
  test('an edit is saved by itself after a moment, on top of the version it came from', async () => {
    const { lab, stored } = await openEditor();
    fireEvent.click(row('1'));
    tap('duplicate');
    await afterQuiet();
    tap('duplicate');
    await afterQuiet();
    expect(stored().steps.map(({ kind }) => kind)).toEqual(['home', 'home', 'home', 'swing', 'repeat']);
    expect(lab.requests(`PUT ${protocolPath}`).map(({ headers }) => headers.get('if-match'))).toEqual(['"1"', '"2"']);
  });

  test('without a connection the edits are kept on the device and sent when it is back', async () => {
    const { lab, stored } = await openEditor();
    fireEvent.click(row('1'));
    lab.away = true;
    tap('duplicate');
    await afterQuiet();
    expect(screen.getByTestId('save-state').textContent).toBe('kept on this device');
    expect(window.localStorage.getItem('evenfall.draft.p1')).toContain('"home"');
    lab.away = false;
    fireEvent.click(row('3'));
    tap('delete');
    await afterQuiet();
    expect(stored().steps.map(({ kind }) => kind)).toEqual(['home', 'home', 'repeat']);
    expect(window.localStorage.getItem('evenfall.draft.p1')).toBeNull();
  });

  test('a refusal says why and keeps the edit', async () => {
    const { lab } = await openEditor();
    lab.on(`PUT ${protocolPath}`, () => problem(400, 'invalid-input', 'steps.0: not accepted here.'));
    fireEvent.click(row('1'));
    tap('duplicate');
    await afterQuiet();
    expect(screen.getByTestId('save-trouble').textContent).toContain('steps.0: not accepted here.');
    expect(titles()).toHaveLength(8);
  });

  test('two editors of one protocol: who saved is said, what differs is shown, and mine is kept if I say so', async () => {
    const { stored, saveByOther } = await openEditor();
    saveByOther({ ...begun, name: 'Two pairs, by Bram' });
    fireEvent.click(row('1'));
    tap('duplicate');
    await afterQuiet();
    await afterQuiet();
    const sheet = screen.getByTestId('conflict-sheet').textContent ?? '';
    expect(sheet).toContain('Bram Oakhurst saved this draft');
    expect(sheet).toContain('Two pairs, by Bram');
    expect(stored().name).toBe('Two pairs, by Bram');
    tap('keep-mine');
    await afterQuiet();
    expect(stored()).toMatchObject({ name: 'Two pairs', steps: [{ kind: 'home' }, { kind: 'home' }, {}, {}] });
  });

  test('theirs is taken if I say so, and undo brings mine back', async () => {
    const { stored, saveByOther } = await openEditor();
    saveByOther({ ...begun, steps: [{ kind: 'home' }, { kind: 'mark', label: 'theirs' }] });
    fireEvent.click(row('1'));
    tap('duplicate');
    await afterQuiet();
    await afterQuiet();
    tap('take-theirs');
    await afterQuiet();
    expect(titles()).toEqual(['1. Home', '2. Mark “theirs”']);
    expect(stored().steps).toHaveLength(2);
    tap('undo');
    expect(titles()).toHaveLength(8);
  });
});

test('what is wrong is said at its step, and issuing is refused with it', async () => {
  const { lab } = await openEditor('operator', {
    ...begun,
    steps: [{ kind: 'home' }, { kind: 'swing', to: 'atlantis' }, { kind: 'dwell', for_s: 60 }],
  });
  expect(screen.getByTestId('finding-unknown-station').textContent).toMatch(/Step 2.*atlantis/);
  expect(row('2').getAttribute('aria-label')).toContain('needs correction');
  tap('issue');
  expect(screen.getByTestId('issue-confirm')).toHaveProperty('disabled', true);
  expect(lab.requests(`POST ${protocolPath}/revisions`)).toEqual([]);
});

test.each(['analyst', 'viewer'] as const)('a %s reads the protocol and is told who may write', async (role) => {
  await openEditor(role);
  expect(titles()).toHaveLength(7);
  expect(screen.queryByTestId('add-step')).toBeNull();
  expect(screen.getByText(/Only an operator, a keeper or an owner may write and issue protocols\./)).toBeTruthy();
  act(() => row('1').focus());
  key('ArrowDown');
  key('Delete');
  expect(titles()).toHaveLength(7);
});
