import fc from 'fast-check';
import { NetCDFReader } from 'netcdfjs';
import { describe, expect, it } from 'vitest';

import { type NetcdfVariable, writeNetcdf } from '#core/formats/netcdf-classic.ts';

import { failure } from './sample-file.ts';

const hex = (bytes: Uint8Array): string => [...bytes].map((byte) => byte.toString(16).padStart(2, '0')).join('');
const scalar: NetcdfVariable = { name: 'v', dimensions: [], data: Int32Array.of(7), attributes: {} };

describe('writeNetcdf', () => {
  it('lays out dimension, attributes, variable and data as the format specification says', () => {
    // Laid out by hand from the grammar of Unidata, "The NetCDF Classic Format Specification" (header, CDF-2 offsets).
    const expected = [
      '43444602', // magic "CDF", version byte 2
      '00000000', // numrecs
      '0000000a 00000001', // NC_DIMENSION, one
      '00000003 64696d00 00000005', // "dim" with one null of padding, length 5
      '0000000c 00000001', // NC_ATTRIBUTE, one
      '00000001 61000000 00000002 00000002 68690000', // "a", NC_CHAR, 2 characters "hi"
      '0000000b 00000001', // NC_VARIABLE, one
      '00000002 76780000 00000001 00000000', // "vx", one dimension, the first
      '00000000 00000000', // no attributes: ABSENT
      '00000001 00000008', // NC_BYTE, vsize 5 rounded up to 8
      '00000000 00000068', // begin, eight bytes: 104
      '0301040105 818181', // 3 1 4 1 5, padded with NC_FILL_BYTE (-127)
    ].join('');
    const bytes = writeNetcdf({ dimensions: { dim: 5 }, attributes: { a: 'hi' }, variables: [{ name: 'vx', dimensions: ['dim'], data: Uint8Array.of(3, 1, 4, 1, 5), attributes: {} }] });
    expect(hex(bytes)).toBe(expected.replaceAll(' ', ''));
  });

  it('writes every double and integer so that another reader gets the same bits', () => {
    fc.assert(
      fc.property(fc.float64Array({ minLength: 1 }), fc.int32Array({ minLength: 1 }), fc.uint8Array({ minLength: 1, max: 127 }), (d, i, b) => {
        const bytes = writeNetcdf({
          dimensions: { nd: d.length, ni: i.length, nb: b.length },
          attributes: {},
          variables: [
            { name: 'b', dimensions: ['nb'], data: b, attributes: {} },
            { name: 'd', dimensions: ['nd'], data: d, attributes: {} },
            { name: 'i', dimensions: ['ni'], data: i, attributes: {} },
          ],
        });
        const reader = new NetCDFReader(bytes);
        expect(Float64Array.from(reader.getDataVariable('d') as number[])).toEqual(d);
        expect(Int32Array.from(reader.getDataVariable('i') as number[])).toEqual(i);
        // this reader gives the padding of a byte variable along with it
        expect(Uint8Array.from((reader.getDataVariable('b') as unknown as Uint8Array[]).slice(0, b.length), ([byte]) => byte)).toEqual(b);
      }),
    );
  });

  it('writes attributes of text, int, double and byte', () => {
    const attributes = { text: 'abcde', int: { int: [-5] }, double: { double: [0.1, NaN] }, byte: { byte: [0, 1, 2, 3, 4] } };
    const reader = new NetCDFReader(writeNetcdf({ dimensions: {}, attributes, variables: [{ ...scalar, attributes }] }));
    for (const list of [reader.globalAttributes, reader.variables[0].attributes])
      expect(list.map(({ name, type, value }) => [name, type, value])).toEqual([
        ['text', 'char', 'abcde'],
        ['int', 'int', -5],
        ['double', 'double', [0.1, NaN]],
        ['byte', 'byte', [0, 1, 2, 3, 4]],
      ]);
  });

  it('refuses a variable whose length is not its dimensions’ product, or whose dimension is unknown', async () => {
    const write = (variable: NetcdfVariable) => failure(() => writeNetcdf({ dimensions: { n: 3 }, attributes: {}, variables: [variable] }));
    const short = await write({ ...scalar, dimensions: ['n'] });
    expect(short.code).toBe('INPUT_LENGTH_MISMATCH');
    expect(short.message).toContain('Variable v has 1 values where its dimensions ask for 3');
    expect((await write({ ...scalar, dimensions: ['m'] })).message).toContain('unknown m');
  });
});
