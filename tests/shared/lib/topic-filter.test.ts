import { filterProblem, matchesTopic } from '@/shared/lib/topic-filter';

/** Examples of the OASIS standard MQTT 3.1.1, sections 4.7.1 to 4.7.3. */
test.each([
  ['sport/tennis/player1/#', 'sport/tennis/player1', true],
  ['sport/tennis/player1/#', 'sport/tennis/player1/ranking', true],
  ['sport/tennis/player1/#', 'sport/tennis/player1/score/wimbledon', true],
  ['sport/#', 'sport', true],
  ['#', 'sport/tennis', true],
  ['sport/tennis/+', 'sport/tennis/player2', true],
  ['sport/tennis/+', 'sport/tennis/player1/ranking', false],
  ['sport/+', 'sport', false],
  ['sport/+', 'sport/', true],
  ['+/+', '/finance', true],
  ['/+', '/finance', true],
  ['+', '/finance', false],
  ['#', '$SYS/uptime', false],
  ['+/monitor/Clients', '$SYS/monitor/Clients', false],
  ['$SYS/#', '$SYS/uptime', true],
  ['$SYS/monitor/+', '$SYS/monitor/Clients', true],
  ['ACCOUNTS', 'Accounts', false],
])('%s and %s: %p', (filter, topic, matches) => {
  expect(filterProblem(filter)).toBeNull();
  expect(matchesTopic(filter, topic)).toBe(matches);
});

test.each(['sport/tennis#', 'sport/tennis/#/ranking', 'sport+', '', 'a\0b'])('%j is no filter', (filter) => {
  expect(filterProblem(filter)).toEqual(expect.any(String));
});
