import { crc32, deflateSync } from 'node:zlib';
import type { SeenRig } from '../interfaces/rig-stations';

type Colour = readonly [red: number, green: number, blue: number];

/** Each thing has a colour of its own, so that a picture can be read back. */
export const colours = {
  floor: [34, 36, 40],
  table: [74, 78, 84],
  bar: [120, 112, 96],
  mass: [150, 154, 162],
  /** On the mass that stands at the turntable's angle; the other one is half a turn further on. */
  mark: [232, 170, 48],
  arm: [216, 218, 222],
  case: [108, 140, 150],
  wall: [58, 54, 50],
  door: [142, 100, 60],
  light: [240, 232, 200],
  text: [236, 236, 236],
} as const satisfies Record<string, Colour>;

export const pictureSize = { width: 400, height: 300 } as const;
/** The axis in the picture, px, and how far from it the outermost mass reaches. */
export const axisPx = { x: 150, y: 150 } as const;
const reachPx = 122;
const door = { x: 350, from: 90, to: 190, width: 10 } as const;

/** PNG (ISO/IEC 15948) of the rig from above: x to the right along the arm at rest, the door on the right, UTC at the bottom. */
export function drawRig({ rig, angleDeg, doorClosed }: SeenRig, utcMs: number): Uint8Array {
  const sheet = new Sheet();
  const { sources, pendulum } = rig;
  const orbitM = sources.orbit?.value ?? 1.4 * pendulum.arm.value;
  const radiusM = sources.radius?.value ?? 0;
  const px = reachPx / (orbitM + Math.max(radiusM, 0.15 * orbitM));
  const at = (radius: number, deg: number) => {
    const rad = (deg * Math.PI) / 180;
    return { x: axisPx.x + radius * px * Math.cos(rad), y: axisPx.y - radius * px * Math.sin(rad) };
  };
  sheet.disc(axisPx, reachPx + 14, colours.table);
  const [first, second] = [at(orbitM, angleDeg), at(orbitM, angleDeg + 180)];
  sheet.bar(first, second, { radius: 5, colour: colours.bar });
  if (sources.shape !== 'none') {
    for (const place of [first, second]) sheet.disc(place, radiusM * px, colours.mass);
  }
  sheet.disc(first, 4, colours.mark);
  sheet.ring(axisPx, (pendulum.arm.value + 2 * pendulum.ballRadius.value) * px, colours.case);
  const half = pendulum.arm.value * px;
  const ends = [-half, half].map((x) => ({ x: axisPx.x + x, y: axisPx.y }));
  sheet.bar(ends[0] ?? axisPx, ends[1] ?? axisPx, { radius: 1.5, colour: colours.arm });
  for (const end of ends) sheet.disc(end, Math.max(4, pendulum.ballRadius.value * px), colours.arm);
  drawDoor(sheet, doorClosed);
  sheet.text({ x: 12, y: 280 }, `${new Date(utcMs).toISOString().slice(11, 19)}Z`);
  return sheet.png();
}

/** The door in the wall on the right: across its gap, or turned into the room with light behind it. */
function drawDoor(sheet: Sheet, closed: boolean): void {
  sheet.box({ x: door.x, y: 0 }, { x: door.x + door.width, y: pictureSize.height }, colours.wall);
  const [hinge, latch] = [
    { x: door.x + door.width / 2, y: door.from },
    { x: door.x + door.width / 2, y: door.to },
  ];
  if (!closed) sheet.box({ x: door.x, y: door.from }, { x: pictureSize.width, y: door.to }, colours.light);
  sheet.bar(hinge, closed ? latch : { x: hinge.x - 62, y: hinge.y + 20 }, { radius: 4, colour: colours.door });
}

interface Point {
  x: number;
  y: number;
}

/** Digits three wide and five high, row by row, the highest bit on the left. */
const glyphs: Readonly<Record<string, readonly number[]>> = {
  '0': [7, 5, 5, 5, 7],
  '1': [2, 6, 2, 2, 7],
  '2': [7, 1, 7, 4, 7],
  '3': [7, 1, 7, 1, 7],
  '4': [5, 5, 7, 1, 1],
  '5': [7, 4, 7, 1, 7],
  '6': [7, 4, 7, 5, 7],
  '7': [7, 1, 1, 1, 1],
  '8': [7, 5, 7, 5, 7],
  '9': [7, 5, 7, 1, 7],
  ':': [0, 2, 0, 2, 0],
  Z: [7, 1, 2, 4, 7],
};
const dotPx = 2;

/** RGB pixels with soft edges. */
class Sheet {
  private readonly pixels = new Uint8Array(pictureSize.width * pictureSize.height * 3);

  constructor() {
    for (let i = 0; i < this.pixels.length; i += 3) this.pixels.set(colours.floor, i);
  }

  disc({ x, y }: Point, radius: number, colour: Colour): void {
    this.paint([x - radius, y - radius, x + radius, y + radius], colour, (px, py) => Math.hypot(px - x, py - y) - radius);
  }

  ring({ x, y }: Point, radius: number, colour: Colour): void {
    this.paint([x - radius, y - radius, x + radius, y + radius], colour, (px, py) => Math.abs(Math.hypot(px - x, py - y) - radius) - 1);
  }

  /** A line with round ends. */
  bar(from: Point, to: Point, { radius, colour }: { radius: number; colour: Colour }): void {
    const [dx, dy] = [to.x - from.x, to.y - from.y];
    const squared = dx * dx + dy * dy || 1;
    const box: Box = [
      Math.min(from.x, to.x) - radius,
      Math.min(from.y, to.y) - radius,
      Math.max(from.x, to.x) + radius,
      Math.max(from.y, to.y) + radius,
    ];
    this.paint(box, colour, (px, py) => {
      const along = Math.min(1, Math.max(0, ((px - from.x) * dx + (py - from.y) * dy) / squared));
      return Math.hypot(px - from.x - along * dx, py - from.y - along * dy) - radius;
    });
  }

  box(from: Point, to: Point, colour: Colour): void {
    this.paint([from.x, from.y, to.x, to.y], colour, (x, y) => (x >= from.x && x < to.x && y >= from.y && y < to.y ? -1 : 1));
  }

  text({ x, y }: Point, words: string): void {
    for (const [place, letter] of [...words].entries())
      for (const [row, bits] of (glyphs[letter] ?? []).entries())
        for (let column = 0; column < 3; column += 1) {
          if ((bits & (4 >> column)) === 0) continue;
          const left = x + dotPx * (4 * place + column);
          const top = y + dotPx * row;
          this.box({ x: left, y: top }, { x: left + dotPx, y: top + dotPx }, colours.text);
        }
  }

  /** Eight bits of red, green and blue, each row without a filter. */
  png(): Uint8Array {
    const { width, height } = pictureSize;
    const rows = Buffer.alloc(height * (1 + 3 * width));
    for (let y = 0; y < height; y += 1) rows.set(this.pixels.subarray(3 * width * y, 3 * width * (y + 1)), y * (1 + 3 * width) + 1);
    const head = Buffer.alloc(13);
    head.writeUInt32BE(width, 0);
    head.writeUInt32BE(height, 4);
    head.set([8, 2, 0, 0, 0], 8);
    const signature = Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]);
    return Buffer.concat([signature, chunk('IHDR', head), chunk('IDAT', deflateSync(rows)), chunk('IEND', Buffer.alloc(0))]);
  }

  /** Paints where the distance to the edge of a shape is negative, pixels across the edge by their share. */
  private paint([left, top, right, bottom]: Box, colour: Colour, distance: (x: number, y: number) => number): void {
    const { width, height } = pictureSize;
    for (let y = Math.max(0, Math.floor(top) - 1); y <= Math.min(height - 1, Math.ceil(bottom) + 1); y += 1)
      for (let x = Math.max(0, Math.floor(left) - 1); x <= Math.min(width - 1, Math.ceil(right) + 1); x += 1) {
        const share = Math.min(1, Math.max(0, 0.5 - distance(x, y)));
        if (share === 0) continue;
        const i = 3 * (y * width + x);
        for (const [of, value] of colour.entries())
          this.pixels[i + of] = Math.round((1 - share) * (this.pixels[i + of] ?? 0) + share * value);
      }
  }
}

type Box = readonly [left: number, top: number, right: number, bottom: number];

function chunk(type: string, data: Buffer): Buffer {
  const body = Buffer.concat([Buffer.from(type, 'latin1'), data]);
  const [length, check] = [Buffer.alloc(4), Buffer.alloc(4)];
  length.writeUInt32BE(data.length);
  check.writeUInt32BE(crc32(body));
  return Buffer.concat([length, body, check]);
}
