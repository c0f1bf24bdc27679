type Round = readonly [x: number, y: number, r: number];

interface IconShape {
  lines?: readonly string[];
  fills?: readonly string[];
  dots?: readonly Round[];
  rings?: readonly Round[];
}

/** Near points up, far points down, clear is a level bar; stop is the octagon. */
const shapes = {
  near: { fills: ['M12 6 20 18H4Z'] },
  far: { fills: ['M12 18 4 6h16Z'] },
  clear: { fills: ['M5 10h14v4H5Z'] },
  home: { lines: ['M5 11.5 12 5l7 6.5', 'M7.5 10v8.5h9V10'] },
  swing: { lines: ['M4 16a9 9 0 0 1 15-5', 'M20 6v5.5h-5.5'] },
  dwell: { lines: ['M3 12h18', 'M8 6v12', 'M16 6v12'] },
  settle: { lines: ['M3 12c2-7 3-7 5 0s3 5 4.5 0 2-2.5 3.5 0H21'] },
  wait: { lines: ['M12 7.5V12l3 2'], rings: [[12, 12, 8]] },
  mark: { lines: ['M7 20V5', 'M7 5h9.5l-2 3.5 2 3.5H7'] },
  repeat: { lines: ['M6 17h9a4.5 4.5 0 0 0 0-9H5', 'M8.5 4.5 5 8l3.5 3.5'] },
  kick: { lines: ['M3 12h2c1.5-8 3-8 4.5 0s3 8 4.5 0 2.5-5 3.5 0H21'] },
  other: { rings: [[12, 12, 8]], dots: [[12, 12, 2]] },
  hold: { fills: ['M7 5h3.5v14H7Z', 'M13.5 5H17v14h-3.5Z'] },
  stop: { lines: ['M8.5 3.5h7l5 5v7l-5 5h-7l-5-5v-7Z'] },
  start: { fills: ['M7 4.5 19.5 12 7 19.5Z'] },
  plus: { lines: ['M12 5v14', 'M5 12h14'] },
  minus: { lines: ['M5 12h14'] },
  more: {
    dots: [
      [5, 12, 1.8],
      [12, 12, 1.8],
      [19, 12, 1.8],
    ],
  },
  up: { lines: ['M12 19V6', 'M6 11.5 12 5.5l6 6'] },
  down: { lines: ['M12 5v13', 'M6 12.5 12 18.5l6-6'] },
  remove: { lines: ['M4.5 7h15', 'M9.5 7V4.5h5V7', 'M6.5 7l1 12.5h9l1-12.5', 'M10.5 11v5', 'M13.5 11v5'] },
  duplicate: { lines: ['M9 9h10.5v10.5H9Z', 'M15 9V4.5H4.5V15H9'] },
  nest: { lines: ['M4 5h16', 'M11 12h9', 'M11 19h9', 'M4 9v6.5h4', 'M6 12.5l3 3-3 3'] },
  unnest: { lines: ['M4 5h16', 'M11 12h9', 'M11 19h9', 'M9 19v-6.5H5', 'M7 9.5l-3 3 3 3'] },
  undo: { lines: ['M8.5 5 4.5 9l4 4', 'M4.5 9H14a5.5 5.5 0 0 1 0 11H9'] },
  redo: { lines: ['M15.5 5l4 4-4 4', 'M19.5 9H10a5.5 5.5 0 0 0 0 11h5'] },
  back: { lines: ['M14.5 5 8 12l6.5 7'] },
  forward: { lines: ['M9.5 5 16 12l-6.5 7'] },
  open: { lines: ['M6 9.5 12 16l6-6.5'] },
  close: { lines: ['M6 6l12 12', 'M18 6 6 18'] },
  tick: { lines: ['M5 12.5 10 17.5 19.5 7'] },
  passed: { lines: ['M8 12.3 11 15.3 16.2 9.3'], rings: [[12, 12, 9]] },
  failed: { lines: ['M9 9l6 6', 'M15 9l-6 6'], rings: [[12, 12, 9]] },
  note: { lines: ['M12 11v5.5'], dots: [[12, 7.8, 1.2]], rings: [[12, 12, 9]] },
  warning: { lines: ['M12 4 21 19.5H3Z', 'M12 10v4.5'], dots: [[12, 17, 1.1]] },
  rig: {
    lines: ['M5.5 17 18.5 7'],
    rings: [[12, 12, 9]],
    dots: [
      [18, 7.4, 2.6],
      [6, 16.6, 2.6],
    ],
  },
  protocols: { lines: ['M4 6h3v5h4V6h3v5h4V6h2', 'M4 16h16', 'M4 20h10'] },
  runs: { lines: ['M3 13c2.5-11 4.5-11 6 0s3 8 4.5 0 2.5-5 3.5 0H21', 'M3 20h18'] },
  calendar: { lines: ['M4 6h16v14H4Z', 'M4 10.5h16', 'M8.5 3.5v4', 'M15.5 3.5v4', 'M8 15h3'] },
  lab: { lines: ['M9.5 4v6L4.8 18.2A1.3 1.3 0 0 0 6 20h12a1.3 1.3 0 0 0 1.2-1.8L14.5 10V4', 'M8 4h8', 'M7.5 15h9'] },
  people: {
    lines: ['M3.5 19.5c.5-4 2.5-6 5.5-6s5 2 5.5 6', 'M16 13.5c2.5 0 4 2 4.5 5'],
    rings: [
      [9, 8, 3.2],
      [16.5, 8.5, 2.4],
    ],
  },
  link: { lines: ['M8 7v4a4 4 0 0 0 8 0V7', 'M9.5 3v4', 'M14.5 3v4', 'M12 15v6'] },
  key: { lines: ['M11.5 12.5 20 4', 'M16.5 7.5l2.5 2.5'], rings: [[8, 16, 4]] },
  lamp: { lines: ['M9.5 18h5', 'M10.5 21h3', 'M9 15c-2-1.5-3-3.2-3-5a6 6 0 0 1 12 0c0 1.8-1 3.5-3 5Z'] },
  import: { lines: ['M12 4v10.5', 'M7.5 10.5 12 15l4.5-4.5', 'M4.5 19.5h15'] },
  export: { lines: ['M12 15V4.5', 'M7.5 9 12 4.5 16.5 9', 'M4.5 19.5h15'] },
  edit: { lines: ['M4.5 19.5 5.5 15 16 4.5l3.5 3.5L9 18.5Z'] },
  mail: { lines: ['M3.5 6h17v12.5h-17Z', 'M3.5 7l8.5 6.5L20.5 7'] },
  leave: { lines: ['M13.5 4.5H5v15h8.5', 'M10 12h10.5', 'M17 8.5 20.5 12 17 15.5'] },
  offline: {
    lines: [
      'M4 4l16 16',
      'M3 9.5A14 14 0 0 1 8 6.7',
      'M12 6a14 14 0 0 1 9 3.5',
      'M6.5 13.2A9 9 0 0 1 10.5 11',
      'M15 11.6a9 9 0 0 1 2.5 1.6',
    ],
    dots: [[12, 17.5, 1.6]],
  },
  compare: { lines: ['M12 3.5v17', 'M4 7h5', 'M4 12h5', 'M4 17h3', 'M15 7h5', 'M15 12h3', 'M15 17h5'] },
  zone: { lines: ['M3 12h18', 'M12 3c3.5 3 3.5 15 0 18', 'M12 3c-3.5 3-3.5 15 0 18'], rings: [[12, 12, 9]] },
  filter: { lines: ['M4 6h16', 'M7 12h10', 'M10 18h4'] },
  search: { lines: ['M15.5 15.5 20 20'], rings: [[10.5, 10.5, 6]] },
  document: { lines: ['M6 3.5h8l4.5 4.5v12.5H6Z', 'M14 3.5V8h4.5', 'M9 13h6', 'M9 16.5h6'] },
} satisfies Record<string, IconShape>;

export type IconName = keyof typeof shapes;

export const iconShapes: Record<IconName, IconShape> = shapes;
