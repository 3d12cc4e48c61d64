import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import type { TypedArray } from '#core/formats/array-bundle.ts';
import { crc32, packArrays, unpackArrays } from '#core/formats/array-bundle.ts';

import { failure, utf8 } from './sample-file.ts';

const bytesOf = (array: TypedArray): number[] => [...new Uint8Array(array.buffer, array.byteOffset, array.byteLength)];

const anyArray: fc.Arbitrary<TypedArray> = fc.oneof(
  fc.int8Array(),
  fc.uint8Array(),
  fc.int16Array(),
  fc.uint16Array(),
  fc.int32Array(),
  fc.uint32Array(),
  fc.float32Array(),
  fc.float64Array(),
);

describe('packArrays and unpackArrays', () => {
  it('give back the same facts, types and bits, each array with a buffer of its own', () => {
    fc.assert(
      fc.property(fc.jsonValue(), fc.dictionary(fc.string(), anyArray), (meta, arrays) => {
        const back = unpackArrays(packArrays(meta, arrays));
        expect(back.meta).toEqual(JSON.parse(JSON.stringify(meta)));
        expect(Object.keys(back.arrays).sort()).toEqual(Object.keys(arrays).sort());
        for (const [name, array] of Object.entries(arrays)) {
          expect(back.arrays[name].constructor).toBe(array.constructor);
          expect(bytesOf(back.arrays[name])).toEqual(bytesOf(array));
          expect(back.arrays[name].buffer.byteLength).toBe(array.byteLength);
        }
      }),
    );
  });

  it('reads a bundle that lies unaligned in a larger buffer', () => {
    const bundle = packArrays(null, { a: new Float64Array([1, NaN, -0]) });
    const shifted = Buffer.alloc(bundle.length + 3);
    shifted.set(bundle, 3);
    expect(unpackArrays(shifted.subarray(3)).arrays.a).toEqual(new Float64Array([1, NaN, -0]));
  });

  it('lays numbers out little-endian at multiples of eight bytes', () => {
    const bundle = packArrays({}, { flags: new Uint8Array([7]), value: new Float64Array([1]) });
    // IEEE 754: 1.0 is 3FF0000000000000
    expect([...bundle.subarray(bundle.length - 8)]).toEqual([0, 0, 0, 0, 0, 0, 0xf0, 0x3f]);
    expect(bundle.length % 8).toBe(0);
  });

  it('refuses every bundle with one changed, missing or added byte', async () => {
    const bundle = packArrays({ name: 'x' }, { a: new Float64Array([1, 2]), b: new Uint32Array([3]) });
    for (let i = 0; i < bundle.length; i++) {
      const changed = bundle.slice();
      changed[i] ^= 0x10;
      expect((await failure(() => unpackArrays(changed))).code).toBe('FILE_MALFORMED');
      expect((await failure(() => unpackArrays(bundle.subarray(0, i)))).code).toBe('FILE_MALFORMED');
    }
    const longer = new Uint8Array(bundle.length + 1);
    longer.set(bundle);
    expect((await failure(() => unpackArrays(longer))).message).toMatch(/array bundle/);
  });

  it('refuses a header that describes impossible arrays though its checksum agrees', async () => {
    const forge = (header: string): Uint8Array => {
      const text = utf8(header);
      const bundle = new Uint8Array(Math.ceil((16 + text.length) / 8) * 8);
      bundle.set(packArrays(null, {}).subarray(0, 8));
      bundle.set(text, 16);
      const view = new DataView(bundle.buffer);
      view.setUint32(8, text.length, true);
      view.setUint32(12, crc32(bundle, 16), true);
      return bundle;
    };
    for (const header of [
      '{}',
      'null',
      '[',
      '{"arrays":[null]}',
      '{"arrays":[{"name":"a","type":"f64","length":1000000000000,"offset":0}]}',
      '{"arrays":[{"name":"a","type":"constructor","length":0,"offset":0}]}',
      '{"arrays":[{"name":"a","type":"f64","length":-1,"offset":0}]}',
      '{"arrays":[{"name":"a","type":"f64","length":0,"offset":-8}]}',
    ])
      expect((await failure(() => unpackArrays(forge(header)))).code).toBe('FILE_MALFORMED');
  });
});

describe('crc32', () => {
  // the check value of CRC-32/ISO-HDLC in the catalogue of parametrised CRC algorithms (G. Cook)
  it('gives the catalogued check value', () => {
    expect(crc32(utf8('123456789'))).toBe(0xcbf43926);
  });
});
