import type { Delimiter } from './mapping.ts';

/** One row of a delimited file; valid only during the callback. Fields are byte ranges, without quotes and outer spaces. */
export interface CsvRecord {
  bytes: Uint8Array;
  /** Line on which the row starts, from 1. */
  line: number;
  /** Byte range of the whole row, without its line end. */
  start: number;
  end: number;
  fieldCount: number;
  fieldStart: Int32Array;
  fieldEnd: Int32Array;
  /** 1 where the field holds doubled quotes, which stand for one. */
  hasDoubledQuote: Uint8Array;
  /** Whether the row has bytes beyond ASCII. */
  hasNonAscii: boolean;
  problem: CsvProblem;
}

export type CsvProblem = 'none' | 'text-after-quote' | 'quote-not-closed' | 'row-too-long' | 'too-many-fields';

export interface CsvSplitter {
  /** Rows of the next piece of the file; a row that the piece cuts waits for the next one. */
  push(piece: Uint8Array): void;
  /** The last rows. */
  end(): void;
}

const LF = 0x0a;
const CR = 0x0d;
const QUOTE = 0x22;
const SPACE = 0x20;
const TAB = 0x09;
const HASH = 0x23;

/** A row longer than this holds an open quote or is not a row. */
const LONGEST_ROW = 2 ** 18;
const MOST_FIELDS = 10_000;
/** Pieces are gathered to this size, so that many tiny ones do not repeat the work on a cut row. */
const BLOCK = 2 ** 16;

/**
 * Splits the pieces of a delimited file (RFC 4180, with LF, CRLF or CR line ends) into rows, in bounded memory.
 * A quote opens a quoted field only at the field's start, so degrees such as 12°30'45"S need none. A leading UTF-8
 * byte-order mark, empty lines and lines that start with # before the first row are passed over. A row at fault is
 * reported with its problem, and reading resumes on the line after its first.
 */
export const createCsvSplitter = (delimiter: Delimiter, onRecord: (record: CsvRecord) => void): CsvSplitter => {
  const separator = delimiter.charCodeAt(0);
  const isSpaced = delimiter === ' ';
  const fieldStart = new Int32Array(MOST_FIELDS);
  const fieldEnd = new Int32Array(MOST_FIELDS);
  const hasDoubledQuote = new Uint8Array(MOST_FIELDS);
  const record: CsvRecord = {
    bytes: new Uint8Array(),
    line: 1,
    start: 0,
    end: 0,
    fieldCount: 0,
    fieldStart,
    fieldEnd,
    hasDoubledQuote,
    hasNonAscii: false,
    problem: 'none',
  };
  const waiting: Uint8Array[] = [];
  let waitingLength = 0;
  let bytes: Uint8Array = new Uint8Array();
  let line = 1;
  let isFirstBlock = true;
  let isBeforeFirstRow = true;
  /** The rest of a row that was too long is passed over up to its line end. */
  let isSkipping = false;

  const isOuter = (byte: number): boolean => byte === SPACE || byte === TAB;

  const closeField = (from: number, to: number, doubled: boolean): void => {
    if (record.fieldCount === MOST_FIELDS) {
      record.problem = 'too-many-fields';
      return;
    }
    while (from < to && isOuter(bytes[from])) from++;
    while (to > from && isOuter(bytes[to - 1])) to--;
    fieldStart[record.fieldCount] = from;
    fieldEnd[record.fieldCount] = to;
    hasDoubledQuote[record.fieldCount++] = doubled ? 1 : 0;
  };

  const skipOuter = (at: number): number => {
    while (at < bytes.length && isOuter(bytes[at]) && bytes[at] !== separator) at++;
    return at;
  };
  const skipGap = (at: number): number => {
    while (at < bytes.length && isOuter(bytes[at])) at++;
    return at;
  };
  const isEnd = (at: number): boolean => at >= bytes.length || bytes[at] === LF || bytes[at] === CR;
  const isSeparator = (byte: number): boolean => (isSpaced ? isOuter(byte) : byte === separator);

  /** Reads the row that starts at `from`; its end without the line end, or -1 where the bytes run out before it. */
  const scanRow = (from: number, isLast: boolean): number => {
    record.fieldCount = 0;
    record.hasNonAscii = false;
    record.problem = 'none';
    hasQuoted = false;
    let at = isSpaced ? skipGap(from) : from;
    for (;;) {
      const open = skipOuter(at);
      if (open < bytes.length && bytes[open] === QUOTE) {
        hasQuoted = true;
        const close = scanQuoted(open + 1);
        if (close < 0) return -1;
        closeField(open + 1, close, quotedHasDouble);
        at = skipOuter(close + 1);
        if (!isEnd(at) && !isSeparator(bytes[at])) {
          record.problem = 'text-after-quote';
          const end = lineEnd(from);
          return end >= bytes.length && !isLast ? -1 : end;
        }
      } else {
        const start = at;
        while (!isEnd(at) && !isSeparator(bytes[at])) {
          if (bytes[at] >= 0x80) record.hasNonAscii = true;
          at++;
        }
        closeField(start, at, false);
      }
      if (isSpaced) at = skipGap(at);
      if (at >= bytes.length && !isLast) return -1;
      if (isEnd(at)) return at;
      if (!isSpaced) at++;
    }
  };

  let quotedHasDouble = false;
  /** Whether the row has a quoted field, which may hold line ends. */
  let hasQuoted = false;
  /** Position of the quote that closes the field, or -1. */
  const scanQuoted = (from: number): number => {
    quotedHasDouble = false;
    for (let at = from; at < bytes.length; at++) {
      if (bytes[at] >= 0x80) record.hasNonAscii = true;
      if (bytes[at] !== QUOTE) continue;
      if (bytes[at + 1] !== QUOTE) return at;
      quotedHasDouble = true;
      at++;
    }
    return -1;
  };

  const lineEnd = (from: number): number => {
    let at = from;
    while (!isEnd(at)) at++;
    return at;
  };

  const countLines = (from: number, to: number): number => {
    let lines = 0;
    for (let at = from; at < to; at++)
      if (bytes[at] === LF || (bytes[at] === CR && bytes[at + 1] !== LF)) lines++;
    return lines;
  };

  const emit = (start: number, end: number, problem: CsvProblem): void => {
    record.bytes = bytes;
    record.line = line;
    record.start = start;
    record.end = end;
    record.problem = problem;
    isBeforeFirstRow = false;
    onRecord(record);
  };

  /** Position after the line end at `at`; -1 where a CR ends the bytes and an LF may follow. */
  const afterLineEnd = (at: number, isLast: boolean): number => {
    if (at >= bytes.length) return at;
    if (bytes[at] === LF) return at + 1;
    if (at + 1 === bytes.length && !isLast) return -1;
    return bytes[at + 1] === LF ? at + 2 : at + 1;
  };

  const readBlock = (block: Uint8Array, isLast: boolean): void => {
    bytes = block;
    let at = 0;
    if (isFirstBlock) {
      if (bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf) at = 3;
      isFirstBlock = false;
    }
    while (at < bytes.length) {
      if (isSkipping) {
        const end = lineEnd(at);
        const next = end < bytes.length ? afterLineEnd(end, isLast) : -1;
        if (next < 0) {
          keepFrom(end);
          return;
        }
        isSkipping = false;
        line++;
        at = next;
        continue;
      }
      const isComment = isBeforeFirstRow && bytes[at] === HASH;
      if (isComment) hasQuoted = false;
      let end = isComment ? lineEnd(at) : scanRow(at, isLast);
      if (isComment && end >= bytes.length && !isLast) end = -1;
      let next = end < 0 ? -1 : afterLineEnd(end, isLast);
      let problem = record.problem;
      let isCut = false;
      if (next < 0) {
        if (!isLast && bytes.length - at <= LONGEST_ROW) {
          keepFrom(at);
          return;
        }
        end = lineEnd(at);
        isCut = end >= bytes.length && !isLast;
        problem = isCut || end - at > LONGEST_ROW ? 'row-too-long' : 'quote-not-closed';
        next = isCut ? end : Math.max(afterLineEnd(end, true), end);
        record.fieldCount = 0;
      }
      const isEmpty = !isComment && problem === 'none' && record.fieldCount === 1 && fieldStart[0] === fieldEnd[0] && bytes[at] !== QUOTE;
      if (!isComment && !isEmpty) emit(at, end, problem);
      if (isCut) isSkipping = true;
      else line += hasQuoted ? countLines(at, next) : 1;
      at = next;
    }
  };

  const keepFrom = (at: number): void => {
    if (at >= bytes.length) return;
    waiting.unshift(bytes.slice(at));
    waitingLength += bytes.length - at;
  };

  const gather = (): Uint8Array => {
    if (waiting.length === 1) {
      const [only] = waiting;
      waiting.length = 0;
      waitingLength = 0;
      return only;
    }
    const block = new Uint8Array(waitingLength);
    let at = 0;
    for (const piece of waiting) {
      block.set(piece, at);
      at += piece.length;
    }
    waiting.length = 0;
    waitingLength = 0;
    return block;
  };

  let gathered = 0;
  return {
    push(piece) {
      if (piece.length === 0) return;
      waiting.push(piece);
      waitingLength += piece.length;
      gathered += piece.length;
      if (gathered < BLOCK) return;
      gathered = 0;
      readBlock(gather(), false);
    },
    end() {
      if (waitingLength > 0) readBlock(gather(), true);
    },
  };
};
