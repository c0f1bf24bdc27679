import { act, fireEvent, render, screen } from '@testing-library/react';
import { PressAndKeep } from '@/components/ui';

const confirmed = jest.fn();
beforeEach(() => {
  jest.useFakeTimers();
  confirmed.mockClear();
  render(<PressAndKeep label="Start the run" statement="The rig may move." onConfirm={confirmed} testID="go" />);
});
afterEach(() => jest.useRealTimers());

const button = () => screen.getByTestId('go');
const wait = (ms: number) => act(() => jest.advanceTimersByTime(ms));
const press = () => fireEvent.pointerDown(button());
const letGo = (at: { clientX: number; clientY: number } = { clientX: 0, clientY: 0 }) =>
  fireEvent(button(), new MouseEvent('pointerup', { bubbles: true, ...at }));

test('a press kept for 1.5 s confirms once, when it is let go', () => {
  press();
  wait(1500);
  expect(screen.getByText('Now let go')).toBeTruthy();
  expect(confirmed).not.toHaveBeenCalled();
  letGo();
  expect(confirmed).toHaveBeenCalledTimes(1);
  wait(5000);
  letGo();
  expect(confirmed).toHaveBeenCalledTimes(1);
});

test('a press let go early confirms nothing and says so', () => {
  press();
  wait(1499);
  letGo();
  wait(5000);
  expect(confirmed).not.toHaveBeenCalled();
  expect(screen.getByRole('status').textContent).toContain('Let go too early');
});

test('sliding off the button takes the press back, and is told', () => {
  press();
  wait(2000);
  letGo({ clientX: 400, clientY: 400 });
  expect(screen.getByRole('status').textContent).toContain('Let go beside the button: nothing was sent.');
  expect(confirmed).not.toHaveBeenCalled();
  press();
  wait(2000);
  fireEvent.pointerCancel(button());
  letGo();
  expect(confirmed).not.toHaveBeenCalled();
});

test('by keyboard a key does not confirm: it leads to a switch and then a button', () => {
  fireEvent.keyDown(button(), { key: 'Enter' });
  wait(5000);
  expect(confirmed).not.toHaveBeenCalled();
  expect(button()).toHaveProperty('disabled', true);
  fireEvent.click(screen.getByTestId('go-switch'));
  fireEvent.click(button());
  expect(confirmed).toHaveBeenCalledTimes(1);
  expect(button()).toHaveProperty('disabled', true);
});
