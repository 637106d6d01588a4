/**
 * How wide a text is, without a font: the figure is read with whatever sans serif the reader has, so widths are those of a wide one
 * and rather too large. Lines are broken and names shortened by them.
 */

const NARROW = /[ijltf.,:;'’|!()[\] ·]/;
const WIDE =
  /[mwMW@%—…ΩΣ]|[\u1100-\u115f\u2e80-\ua4cf\uac00-\ud7a3\uf900-\ufaff\ufe30-\ufe6f\uff00-\uff60]|[\u{1f000}-\u{3fffd}]/u;
/** They sit on the letter before them. */
const COMBINING = /\p{M}/u;

function emOf(character: string): number {
  if (COMBINING.test(character)) return 0;
  if (WIDE.test(character)) return 1;
  if (NARROW.test(character)) return 0.38;
  return /\p{Lu}/u.test(character) ? 0.72 : 0.62;
}

/** Width in the units of the font size. */
export function textWidth(text: string, fontSize: number): number {
  return [...text].reduce((sum, character) => sum + emOf(character), 0) * fontSize;
}

/** The text, or as much of it as fits with an ellipsis. */
export function shortened(text: string, fontSize: number, width: number): string {
  if (textWidth(text, fontSize) <= width) return text;
  const characters = [...text];
  while (characters.length > 0 && textWidth(`${characters.join('')}…`, fontSize) > width) characters.pop();
  return `${characters.join('').trimEnd()}…`;
}

/** The text in lines that fit, at most so many; what is left over ends the last one with an ellipsis. */
export function wrapped(text: string, fontSize: number, width: number, mostLines: number): string[] {
  const found: string[] = [];
  let rest = text.split(/\s+/).filter((word) => word !== '');
  while (rest.length > 0 && found.length < mostLines - 1) {
    let count = 1;
    while (count < rest.length && textWidth(rest.slice(0, count + 1).join(' '), fontSize) <= width) count++;
    found.push(shortened(rest.slice(0, count).join(' '), fontSize, width));
    rest = rest.slice(count);
  }
  const last = rest.join(' ');
  return last === '' ? found : [...found, shortened(last, fontSize, width)];
}
