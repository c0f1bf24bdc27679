export { crc16, hex8 } from './crc';
export { decodeLine } from './decode';
export { encode, seal, stamp } from './encode';
export { LineSplitter } from './line-splitter';
export * from './messages';
export { REFUSALS, refusalWords, type RefusalCode } from './refusals';
