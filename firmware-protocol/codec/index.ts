export { crc16, hex8 } from './crc';
export { decodeLine } from './decode';
export { encode } from './encode';
export { LineSplitter } from './line-splitter';
export * from './messages';
export { refusalWords, type RefusalCode } from './refusals';
