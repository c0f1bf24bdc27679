#!/usr/bin/env node
/** `npm run firmware`: builds the controller's firmware from its sources. `--check` compares it with the committed image instead. */
import { copyFileSync, readFileSync } from 'node:fs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { boardImage, buildBoard, sizesOf } from './lib/firmware-build.mjs';
import { giveUp, say } from './lib/say.mjs';

const check = process.argv.includes('--check');
await ensureDebianPackages(['gcc-avr', 'avr-libc']);
const { elf, hex } = await buildBoard();
const { flash, memory } = await sizesOf(elf);
say(`${flash} bytes of program (of 32768), ${memory} bytes of static memory (of 2048).`);
if (!check) copyFileSync(hex, boardImage);
else if (!readFileSync(hex).equals(readFileSync(boardImage)))
  giveUp('firmware-protocol/firmware/evenfall.hex is not what its sources give. Run `npm run firmware` and commit it.');
