import { closeSync, openSync, writeSync } from 'node:fs';
import { seeded } from './drawn-spot';

/** A film (YUV4MPEG2) of a light spot that rests at one known column after the other. */

const size = { width: 320, height: 240 };
const framesPerSecond = 20;
const framesPerLevel = 10;
/** Of luma, whose range is 16 to 235. */
const film = { y: 120.4, sigma: 5, height: 140, background: 24, perColumn: 0.04, noise: 2 };

/** Where the spot rests, px from the centre of the leftmost column: far enough apart to be told from each other, at all parts of a pixel. */
export const levelsOf = (): number[] => Array.from({ length: 8 }, (_, i) => 60 + 24.37 * ((i * 3) % 8));

/** Writes the film; it runs for some seconds and a loop of it is a loop of the places. */
export function writeSpotFilm(path: string): void {
  const file = openSync(path, 'w');
  const deviate = seeded(23);
  const noise = Float64Array.from({ length: 9973 }, deviate);
  writeSync(file, `YUV4MPEG2 W${size.width} H${size.height} F${framesPerSecond}:1 Ip A1:1 C420jpeg\n`);
  const grey = Buffer.alloc((size.width * size.height) / 2, 128);
  levelsOf().forEach((level, index) => {
    for (let i = 0; i < framesPerLevel; i += 1) {
      writeSync(file, 'FRAME\n');
      writeSync(file, luma(level, { noise, from: (index * framesPerLevel + i) * 1237 }));
      writeSync(file, grey);
    }
  });
  closeSync(file);
}

/** Brightness of one picture; only the rows about the spot have noise, which is all that is read. */
function luma(level: number, { noise, from }: { noise: Float64Array; from: number }): Buffer {
  const rows = Buffer.alloc(size.width * size.height, film.background);
  for (let y = 80; y < 160; y += 1)
    for (let x = 0; x < size.width; x += 1) {
      const exponent = ((x - level) ** 2 + (y - film.y) ** 2) / film.sigma ** 2;
      const light = film.background + film.perColumn * x + film.height * Math.exp(-exponent / 2);
      rows[y * size.width + x] = Math.round(light + film.noise * (noise[(from + y * size.width + x) % noise.length] as number));
    }
  return rows;
}
