#!/usr/bin/env node
/**
 * `npm run firmware`: builds the controller's firmware from its sources. `--check` compares it with the committed image instead;
 * `--host` builds the program that the tests drive, and prints its path.
 */
import { copyFileSync, readFileSync, writeFileSync } from 'node:fs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { boardImage, boardSymbols, buildBoard, ensureHostBuild, sizesOf, symbolsOf } from './lib/firmware-build.mjs';
import { giveUp, say } from './lib/say.mjs';

if (process.argv.includes('--host')) {
  await ensureDebianPackages(['g++']);
  process.stdout.write(`${await ensureHostBuild()}\n`);
} else {
  await ensureDebianPackages(['gcc-avr', 'avr-libc']);
  const { elf, hex } = await buildBoard();
  const { flash, memory } = await sizesOf(elf);
  say(`${flash} bytes of program (of 32768), ${memory} bytes of static memory (of 2048).`);
  const symbols = await symbolsOf(elf);
  if (!process.argv.includes('--check')) {
    copyFileSync(hex, boardImage);
    writeFileSync(boardSymbols, symbols);
  } else if (!readFileSync(hex).equals(readFileSync(boardImage)))
    giveUp('firmware-protocol/firmware/evenfall.hex is not what its sources give. Run `npm run firmware` and commit it.');
  else if (readFileSync(boardSymbols, 'utf8') !== symbols)
    giveUp('firmware-protocol/firmware/evenfall.symbols.json does not belong to the image. Run `npm run firmware` and commit it.');
}
