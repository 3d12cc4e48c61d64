import { NumericalError } from '#core/errors.ts';

/** Attribute values: text, or numbers stored as int or double. */
export type NetcdfAttribute = string | { int: number[] } | { double: number[] } | { byte: number[] };

export interface NetcdfVariable {
  name: string;
  /** Names of its dimensions, slowest first; none for a scalar. */
  dimensions: string[];
  /** In C order. Uint8Array is stored as byte, Int32Array as int, Float64Array as double. */
  data: Uint8Array | Int32Array | Float64Array;
  attributes: Record<string, NetcdfAttribute>;
}

export interface NetcdfDataset {
  dimensions: Record<string, number>;
  attributes: Record<string, NetcdfAttribute>;
  variables: NetcdfVariable[];
}

const TAG = { dimension: 10, variable: 11, attribute: 12 } as const;
const TYPE = { byte: 1, char: 2, int: 4, double: 6 } as const;

/** NC_FILL_BYTE, -127, as an unsigned byte: what the specification asks for between a byte variable and the next. */
const BYTE_FILL = 0x81;

const padded = (length: number): number => 4 * Math.ceil(length / 4);

/** Appends big-endian values; with `bytes` null it only counts. */
class Writer {
  at = 0;
  readonly view: DataView | null;
  readonly bytes: Uint8Array | null;

  constructor(length: number | null) {
    this.bytes = length === null ? null : new Uint8Array(length);
    this.view = this.bytes && new DataView(this.bytes.buffer);
  }

  u32(value: number): void {
    this.view?.setUint32(this.at, value);
    this.at += 4;
  }

  u64(value: number): void {
    this.view?.setBigUint64(this.at, BigInt(value));
    this.at += 8;
  }

  text(value: string): void {
    const encoded = new TextEncoder().encode(value);
    this.u32(encoded.length);
    this.bytes?.set(encoded, this.at);
    this.at += padded(encoded.length);
  }

  /** Values of a typed array, padded to four bytes with `fill`: zeros in the header, the type's fill value in data. */
  array(data: NetcdfVariable['data'], fill = 0): void {
    let at = this.at;
    if (this.view && this.bytes) {
      if (data instanceof Float64Array) for (const value of data) this.view.setFloat64((at += 8) - 8, value);
      else if (data instanceof Int32Array) for (const value of data) this.view.setInt32((at += 4) - 4, value);
      else this.bytes.set(data, at);
      this.bytes.fill(fill, this.at + data.byteLength, this.at + padded(data.byteLength));
    }
    this.at += padded(data.byteLength);
  }
}

const writeAttributes = (w: Writer, attributes: Record<string, NetcdfAttribute>): void => {
  const entries = Object.entries(attributes);
  w.u32(entries.length === 0 ? 0 : TAG.attribute);
  w.u32(entries.length);
  for (const [name, value] of entries) {
    w.text(name);
    if (typeof value === 'string') {
      w.u32(TYPE.char);
      w.text(value);
      continue;
    }
    const numbers = 'int' in value ? Int32Array.from(value.int) : 'double' in value ? Float64Array.from(value.double) : Uint8Array.from(value.byte);
    w.u32('int' in value ? TYPE.int : 'double' in value ? TYPE.double : TYPE.byte);
    w.u32(numbers.length);
    w.array(numbers);
  }
};

const typeOf = (data: NetcdfVariable['data']): number => (data instanceof Float64Array ? TYPE.double : data instanceof Int32Array ? TYPE.int : TYPE.byte);

const writeHeader = (w: Writer, dataset: NetcdfDataset, begins: number[]): void => {
  const names = Object.keys(dataset.dimensions);
  for (const byte of [0x43, 0x44, 0x46, 2]) {
    if (w.bytes) w.bytes[w.at] = byte;
    w.at++;
  }
  w.u32(0);
  w.u32(names.length === 0 ? 0 : TAG.dimension);
  w.u32(names.length);
  for (const name of names) {
    w.text(name);
    w.u32(dataset.dimensions[name]);
  }
  writeAttributes(w, dataset.attributes);
  w.u32(dataset.variables.length === 0 ? 0 : TAG.variable);
  w.u32(dataset.variables.length);
  for (const [k, variable] of dataset.variables.entries()) {
    w.text(variable.name);
    w.u32(variable.dimensions.length);
    for (const dimension of variable.dimensions) w.u32(names.indexOf(dimension));
    writeAttributes(w, variable.attributes);
    w.u32(typeOf(variable.data));
    w.u32(padded(variable.data.byteLength));
    w.u64(begins[k] ?? 0);
  }
};

const checkVariable = ({ name, dimensions, data }: NetcdfVariable, sizes: Record<string, number>): void => {
  const unknown = dimensions.find((dimension) => !(dimension in sizes));
  const expected = dimensions.reduce((product, dimension) => product * (sizes[dimension] ?? 0), 1);
  if (unknown !== undefined || expected !== data.length)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', `Variable ${name} has ${data.length} values where its dimensions ask for ${unknown ? `the unknown ${unknown}` : expected}.`, { details: { variable: name } });
  if (padded(data.byteLength) > 2 ** 32 - 4)
    throw new NumericalError('FILE_TOO_LARGE', `Variable ${name} is larger than the 4 GiB that this file format allows.`, { details: { variable: name } });
};

/**
 * A NetCDF classic file with 64-bit offsets (CDF-2; Unidata, The NetCDF Classic Format Specification). Same bytes for
 * the same data set. @throws NumericalError INPUT_LENGTH_MISMATCH, FILE_TOO_LARGE naming the variable
 */
export const writeNetcdf = (dataset: NetcdfDataset): Uint8Array => {
  for (const variable of dataset.variables) checkVariable(variable, dataset.dimensions);
  const counter = new Writer(null);
  writeHeader(counter, dataset, []);
  const begins: number[] = [];
  let end = counter.at;
  for (const { data } of dataset.variables) {
    begins.push(end);
    end += padded(data.byteLength);
  }
  const w = new Writer(end);
  writeHeader(w, dataset, begins);
  for (const { data } of dataset.variables) w.array(data, BYTE_FILL);
  return w.bytes!;
};
