/**
 * Rows of comma-separated values (RFC 4180), safe to open in a spreadsheet: a text that one would take for a formula is preceded by an
 * apostrophe, which spreadsheets do not show.
 */

export type CsvCell = string | number | null | undefined;

/** A leading one of these makes a cell a formula, also behind blanks. */
const FORMULA = /^\s*[=+\-@\t\r]/;

/** Numbers are written as they are, also negative ones; null and undefined leave the cell empty. */
function csvCell(cell: CsvCell): string {
  if (cell === null || cell === undefined) return '';
  if (typeof cell === 'number') return String(cell);
  const text = FORMULA.test(cell) ? `'${cell}` : cell;
  return /[",\r\n]|^\s|\s$/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}

/** One row with its line end. */
export function csvRow(cells: readonly CsvCell[]): string {
  return `${cells.map(csvCell).join(',')}\r\n`;
}
