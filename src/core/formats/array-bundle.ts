import { NumericalError } from '#core/errors.ts';

/*
 * Layout, little-endian:
 *   0  8 bytes   "SLVGARR1"
 *   8  uint32    length of the header in bytes
 *  12  uint32    CRC-32 (ISO 3309) of everything from byte 16 on
 *  16  header    UTF-8 JSON { meta, arrays: [{ name, type, length, offset }] }, offsets from the first array
 *      arrays    each at a multiple of 8 bytes, zeros between them
 */
const MAGIC = [0x53, 0x4c, 0x56, 0x47, 0x41, 0x52, 0x52, 0x31];
const HEADER_AT = 16;

const CONSTRUCTORS = {
  i8: Int8Array,
  u8: Uint8Array,
  i16: Int16Array,
  u16: Uint16Array,
  i32: Int32Array,
  u32: Uint32Array,
  f32: Float32Array,
  f64: Float64Array,
} as const;

type ElementType = keyof typeof CONSTRUCTORS;

export type TypedArray =
  | Int8Array
  | Uint8Array
  | Int16Array
  | Uint16Array
  | Int32Array
  | Uint32Array
  | Float32Array
  | Float64Array;

interface Entry {
  name: string;
  type: ElementType;
  length: number;
  offset: number;
}

export interface ArrayBundle {
  meta: unknown;
  /** Each array owns its buffer, so that it can be transferred alone. */
  arrays: Record<string, TypedArray>;
}

const isLittleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;
const alignUp = (offset: number): number => Math.ceil(offset / 8) * 8;

const typeOf = (array: TypedArray, name: string): ElementType => {
  for (const [type, Constructor] of Object.entries(CONSTRUCTORS))
    if (array instanceof Constructor) return type as ElementType;
  throw new TypeError(`Array "${name}" is not a typed array that a bundle can hold.`);
};

/** CRC-32 by ISO 3309, reflected polynomial 0xEDB88320. */
export const crc32 = (bytes: Uint8Array, from = 0): number => {
  let crc = 0xffffffff;
  for (let i = from; i < bytes.length; i++) crc = (crc >>> 8) ^ CRC_TABLE[(crc ^ bytes[i]) & 0xff];
  return (crc ^ 0xffffffff) >>> 0;
};

const CRC_TABLE = Uint32Array.from({ length: 256 }, (_, n) => {
  let c = n;
  for (let k = 0; k < 8; k++) c = c & 1 ? (c >>> 1) ^ 0xedb88320 : c >>> 1;
  return c;
});

const swapBytes = (bytes: Uint8Array, width: number): void => {
  for (let i = 0; i < bytes.length; i += width) bytes.subarray(i, i + width).reverse();
};

/**
 * One block of bytes from JSON facts and named typed arrays: how observation columns and meshes are stored and sent.
 * The same input gives the same bytes; arrays keep the order of the object's keys.
 */
export const packArrays = (meta: unknown, arrays: Record<string, TypedArray>): Uint8Array => {
  const entries: Entry[] = [];
  let dataLength = 0;
  for (const [name, array] of Object.entries(arrays)) {
    entries.push({ name, type: typeOf(array, name), length: array.length, offset: dataLength });
    dataLength = alignUp(dataLength + array.byteLength);
  }
  const header = new TextEncoder().encode(JSON.stringify({ meta, arrays: entries }));
  const dataStart = alignUp(HEADER_AT + header.length);

  const bytes = new Uint8Array(dataStart + dataLength);
  const view = new DataView(bytes.buffer);
  bytes.set(MAGIC);
  view.setUint32(8, header.length, true);
  bytes.set(header, HEADER_AT);
  for (const { name, offset } of entries) {
    const array = arrays[name];
    const target = bytes.subarray(dataStart + offset, dataStart + offset + array.byteLength);
    target.set(new Uint8Array(array.buffer, array.byteOffset, array.byteLength));
    if (!isLittleEndian) swapBytes(target, array.BYTES_PER_ELEMENT);
  }
  view.setUint32(12, crc32(bytes, HEADER_AT), true);
  return bytes;
};

const malformed = (what: string): NumericalError =>
  new NumericalError(
    'FILE_MALFORMED',
    `These bytes are not a complete array bundle: ${what}. Fetch or build them again; if they came from the database, restore that row from a backup.`,
    { details: { what } },
  );

/**
 * What `packArrays` packed. Every array is a copy that owns its buffer.
 * @throws NumericalError FILE_MALFORMED when a byte is missing, added or changed.
 */
export const unpackArrays = (bytes: Uint8Array): ArrayBundle => {
  if (bytes.length < HEADER_AT || MAGIC.some((byte, i) => bytes[i] !== byte))
    throw malformed('they do not start with the bundle signature');
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const headerEnd = HEADER_AT + view.getUint32(8, true);
  if (headerEnd > bytes.length) throw malformed('the header is cut off');
  if (crc32(bytes, HEADER_AT) !== view.getUint32(12, true)) throw malformed('the checksum does not agree');

  const { meta, entries } = readHeader(bytes.subarray(HEADER_AT, headerEnd));
  const arrays: Record<string, TypedArray> = {};
  const dataStart = alignUp(headerEnd);
  let end = dataStart;
  for (const { name, type, length, offset } of entries) {
    const Constructor = CONSTRUCTORS[type];
    const byteLength = length * Constructor.BYTES_PER_ELEMENT;
    const at = dataStart + offset;
    if (at !== end || at + byteLength > bytes.length) throw malformed(`array "${name}" lies outside them`);
    end = alignUp(at + byteLength);
    const own = bytes.slice(at, at + byteLength);
    if (!isLittleEndian) swapBytes(own, Constructor.BYTES_PER_ELEMENT);
    // Buffer.slice shares memory, and a pooled Buffer is not aligned: copy unless the slice owns its buffer
    const buffer = own.buffer.byteLength === byteLength ? own.buffer : new Uint8Array(own).buffer;
    Object.defineProperty(arrays, name, {
      value: new Constructor(buffer as ArrayBuffer),
      enumerable: true,
      writable: true,
      configurable: true,
    });
  }
  if (end !== bytes.length) throw malformed('their length does not match the header');
  return { meta, arrays };
};

const readHeader = (bytes: Uint8Array): { meta: unknown; entries: Entry[] } => {
  let header: unknown;
  try {
    header = JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(bytes));
  } catch (cause) {
    throw new NumericalError('FILE_MALFORMED', malformed('the header is not JSON').message, { cause });
  }
  const { meta, arrays } = (header ?? {}) as { meta?: unknown; arrays?: unknown };
  if (!Array.isArray(arrays)) throw malformed('the header lists no arrays');
  for (const entry of arrays as Partial<Entry>[])
    if (
      typeof entry?.name !== 'string' ||
      typeof entry.type !== 'string' ||
      !Object.hasOwn(CONSTRUCTORS, entry.type) ||
      !Number.isSafeInteger(entry.length) ||
      !Number.isSafeInteger(entry.offset) ||
      (entry.length as number) < 0
    )
      throw malformed('the header describes an array that cannot be');
  return { meta, entries: arrays as Entry[] };
};
