/** Elements of an XML document as text. Everything that is not markup passes through `escapeXml`, once. */

const ENTITIES: Record<string, string> = { '&': '&amp;', '<': '&lt;', '>': '&gt;', '"': '&quot;', "'": '&#39;' };

/** What XML 1.0 (section 2.2) allows no document to hold, not even escaped: most control characters, halves of surrogate pairs. */
const FORBIDDEN =
  // biome-ignore lint/suspicious/noControlCharactersInRegex: they are what is looked for
  /[\u0000-\u0008\u000b\u000c\u000e-\u001f\ufffe\uffff]|[\ud800-\udbff](?![\udc00-\udfff])|(?<![\ud800-\udbff])[\udc00-\udfff]/g;

/** Text for an element or an attribute: markup escaped, forbidden characters replaced by U+FFFD, line breaks and tabs by spaces. */
export function escapeXml(text: string): string {
  return text
    .replace(FORBIDDEN, '\ufffd')
    .replace(/[\t\r\n\u0085\u2028\u2029]+/g, ' ')
    .replace(/[&<>"']/g, (character) => ENTITIES[character]);
}

export type Attributes = Readonly<Record<string, string | number | undefined>>;

/** Markup that is escaped already; plain strings cannot be put in its place by accident. */
export interface Markup {
  readonly markup: string;
}

/** Numbers are written to hundredths: the same bytes everywhere, and finer than any printer. */
export function fixed(value: number): string {
  return String(Number(value.toFixed(2)) + 0);
}

function attributeText(value: string | number): string {
  return typeof value === 'number' ? fixed(value) : escapeXml(value);
}

/** An element with its attributes (those undefined are left out) and its children, each text or markup. */
export function element(name: string, attributes: Attributes, ...children: readonly (Markup | string)[]): Markup {
  const written = Object.entries(attributes)
    .filter((entry): entry is [string, string | number] => entry[1] !== undefined)
    .map(([key, value]) => ` ${key}="${attributeText(value)}"`)
    .join('');
  if (children.length === 0) return { markup: `<${name}${written}/>` };
  const content = children.map((child) => (typeof child === 'string' ? escapeXml(child) : child.markup)).join('');
  return { markup: `<${name}${written}>${content}</${name}>` };
}

/** Elements one after the other, each on its line. */
export function lines(children: readonly Markup[]): Markup {
  return { markup: children.map((child) => `\n${child.markup}`).join('') };
}

/** Text whose first line stands on (x, y). */
export function textAt(x: number, y: number, text: string | Markup, attributes: Attributes): Markup {
  return element('text', { x, y, ...attributes }, text);
}
