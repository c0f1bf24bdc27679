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
/** The responder system waits a moment before it calls a touch a press. */
const pressDelayMs = 50;

test('a press kept for 1.5 s confirms once', () => {
  fireEvent.mouseDown(button());
  wait(pressDelayMs + 1499);
  expect(confirmed).not.toHaveBeenCalled();
  wait(60);
  expect(confirmed).toHaveBeenCalledTimes(1);
  fireEvent.mouseUp(button());
  wait(5000);
  expect(confirmed).toHaveBeenCalledTimes(1);
});

test('a press let go early confirms nothing and says so', () => {
  fireEvent.mouseDown(button());
  wait(900);
  fireEvent.mouseUp(button());
  wait(5000);
  expect(confirmed).not.toHaveBeenCalled();
  expect(screen.getByRole('status').textContent).toContain('Let go too early');
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
