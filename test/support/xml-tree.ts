/** A strict reader of the XML that this project writes: elements, quoted attributes, text with the five entities and numbers. */

export interface XmlElement {
  readonly name: string;
  readonly attributes: Readonly<Record<string, string>>;
  readonly children: XmlElement[];
  /** Text directly inside, entities resolved. */
  text: string;
}

const TOKEN = /<\?xml [^?]*\?>|<\/([A-Za-z][\w:-]*)\s*>|<([A-Za-z][\w:-]*)((?:\s+[\w:-]+="[^"<]*")*)\s*(\/?)>|[^<]+/y;
const NAMED: Record<string, string> = { amp: '&', lt: '<', gt: '>', quot: '"', apos: "'" };
/** XML 1.0, section 2.2: control characters, halves of surrogate pairs, two that are none. */
const FORBIDDEN = /[^\t\n\r\P{Cc}\u007f-\u009f]|[\p{Cs}\ufffe\uffff]/u;

/** The root element. Throws an Error for anything that is not well formed. */
export function xmlTree(text: string): XmlElement {
  if (FORBIDDEN.test(text)) throw new Error('a character that XML does not allow');
  const top: XmlElement = { name: '', attributes: {}, children: [], text: '' };
  const open = [top];
  TOKEN.lastIndex = 0;
  while (TOKEN.lastIndex < text.length) {
    const from = TOKEN.lastIndex;
    const match = TOKEN.exec(text);
    if (!match) throw new Error(`not well formed at "${text.slice(from, from + 60)}"`);
    const [token, closes, opens, attributes, isEmpty] = match;
    const current = open[open.length - 1];
    if (closes !== undefined) {
      if (open.pop()!.name !== closes) throw new Error(`</${closes}> closes <${current.name}>`);
    } else if (opens !== undefined) {
      const element: XmlElement = { name: opens, attributes: attributesOf(attributes), children: [], text: '' };
      current.children.push(element);
      if (isEmpty === '') open.push(element);
    } else if (!token.startsWith('<?xml')) {
      current.text += resolved(token);
    }
  }
  if (open.length !== 1 || top.children.length !== 1 || top.text.trim() !== '') throw new Error('not one closed root');
  return top.children[0];
}

function attributesOf(text: string): Record<string, string> {
  const attributes: Record<string, string> = {};
  for (const [, key, value] of text.matchAll(/([\w:-]+)="([^"]*)"/g)) {
    if (key in attributes) throw new Error(`${key} twice`);
    attributes[key] = resolved(value);
  }
  return attributes;
}

function resolved(text: string): string {
  return text.replace(/&(?:(\w+)|#(\d+));|&/g, (reference, name?: string, code?: string) => {
    const character = name === undefined ? code && String.fromCodePoint(Number(code)) : NAMED[name];
    if (!character) throw new Error(`entity ${reference}`);
    return character;
  });
}

/** An element and everything inside it, in the order of the document. */
export function everyElement(root: XmlElement): XmlElement[] {
  return [root, ...root.children.flatMap(everyElement)];
}

/** All the text inside an element. */
export function textOf(root: XmlElement): string {
  return root.text + root.children.map(textOf).join('');
}
