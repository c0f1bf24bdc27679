import { readdir, readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { brotliCompress, constants } from 'node:zlib';

const compress = promisify(brotliCompress);
const packable = /\.(js|css|svg|json)$/;
/** Below one packet of the network there is nothing to gain. */
const leastBytes = 1400;

/** Writes a Brotli copy beside every text file in a folder and below it, as tightly as it goes: there is time for it here and none while somebody waits. */
export async function precompress(folder) {
  const paths = (await readdir(folder, { recursive: true })).filter((path) => packable.test(path)).map((path) => join(folder, path));
  await Promise.all(
    paths.map(async (path) => {
      const bytes = await readFile(path);
      if (bytes.length < leastBytes) return;
      const params = { [constants.BROTLI_PARAM_QUALITY]: constants.BROTLI_MAX_QUALITY, [constants.BROTLI_PARAM_SIZE_HINT]: bytes.length };
      await writeFile(`${path}.br`, await compress(bytes, { params }));
    }),
  );
}
