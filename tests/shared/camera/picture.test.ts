import { pictureTypeOf } from '@/shared/camera/picture';

const latin = (text: string) => Uint8Array.from(text, (letter) => letter.charCodeAt(0));
/** Signatures as the standards print them: JPEG ISO/IEC 10918-1 B.1.1.3, PNG ISO/IEC 15948 5.2. */
const jpeg = Uint8Array.of(0xff, 0xd8, 0xff, 0xe0, 0, 16, 0xff, 0xd9);
const png = Uint8Array.of(0x89, 0x50, 0x4e, 0x47, 13, 10, 26, 10, 0, 0, 0, 0, 0x49, 0x45, 0x4e, 0x44, 0xae, 0x42, 0x60, 0x82);

test.each([
  ['a JPEG', jpeg, 'image/jpeg'],
  ['a JPEG filled up with zeros and a line end', Uint8Array.of(...jpeg, 0, 0, 13, 10), 'image/jpeg'],
  ['a PNG', png, 'image/png'],
  ['a JPEG that was cut off', jpeg.slice(0, -2), null],
  ['a PNG that was cut off', png.slice(0, -6), null],
  ['a page', latin('<!doctype html><title>Camera</title>'), null],
  ['a GIF', latin('GIF89a;'), null],
  ['nothing', new Uint8Array(0), null],
])('%s is told by its own bytes', (_, bytes, type) => {
  expect(pictureTypeOf(bytes)).toBe(type);
});
