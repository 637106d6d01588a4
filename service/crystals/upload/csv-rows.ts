/** The rows of a text table, read block by block: separated by commas, tabs, semicolons or spaces, with comments after #. */
import Papa from 'papaparse';
import { blocksFrom, type OpenFile } from './file-blocks.ts';
import { faultyValues } from './values-part.ts';

/** A row of 100,000 numbers of 25 characters fits well. */
const MOST_LINE_CHARACTERS = 2 ** 23;
const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;

/** The number that a cell is; undefined for anything else, the empty cell too, of which Number() would make 0. */
export function numberIn(cell: string): number | undefined {
  return NUMBER.test(cell) ? Number(cell) : undefined;
}

export const DELIMITERS: Readonly<Record<string, string>> = {
  '\t': 'tabs',
  ';': 'semicolons',
  ',': 'commas',
  ' ': 'spaces',
};

/** What separates the cells of a line. */
function delimiterOf(line: string): string {
  return ['\t', ';', ',', ' '].find((delimiter) => line.includes(delimiter)) ?? ',';
}

/** Lines of whole text, several at a time. */
function* textBlocks(file: OpenFile): Generator<string> {
  const decoder = new TextDecoder('utf-8', { fatal: true });
  const decoded = (bytes?: Uint8Array): string => {
    try {
      return bytes ? decoder.decode(bytes, { stream: true }) : decoder.decode();
    } catch {
      throw faultyValues('is of no known format: neither .npy nor HDF5 nor text in UTF-8');
    }
  };
  let pending = '';
  for (const block of blocksFrom(file, 0)) {
    pending += decoded(block);
    const end = pending.lastIndexOf('\n') + 1;
    if (end > 0) yield pending.slice(0, end);
    pending = pending.slice(end);
    if (pending.length > MOST_LINE_CHARACTERS)
      throw faultyValues(`has a line of more than ${MOST_LINE_CHARACTERS} characters`);
  }
  pending += decoded();
  if (pending !== '') yield pending;
}

export interface CsvRows {
  readonly delimiter: string;
  /** Every row that is neither empty nor a comment, cells trimmed. */
  rows(): Generator<readonly string[]>;
}

export function csvRows(file: OpenFile): CsvRows {
  const first = firstLineOf(file);
  if (first.includes('\0')) throw faultyValues('is of no known format: neither .npy nor HDF5 nor text');
  const delimiter = delimiterOf(first.trim());
  return {
    delimiter,
    *rows() {
      for (const text of textBlocks(file)) {
        const { data, errors } = Papa.parse<string[]>(
          delimiter === ' ' ? text.replaceAll(/^ +| +$|( ) +/gm, '$1') : text,
          {
            delimiter,
            comments: '#',
            skipEmptyLines: 'greedy',
          },
        );
        if (errors.length > 0) throw faultyValues('has quotation marks that do not close');
        for (const row of data) yield row.map((cell) => cell.trim());
      }
    },
  };
}

function firstLineOf(file: OpenFile): string {
  for (const text of textBlocks(file)) {
    const line = text.split('\n').find((each) => each.trim() !== '' && !each.startsWith('#'));
    if (line !== undefined) return line;
  }
  throw faultyValues('is empty');
}
