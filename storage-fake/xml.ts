import { S3Error } from './errors';

/**
 * A document to be written: text, a list of the same element, or further elements. Undefined is left out; the member
 * `@` holds attributes as they are to stand in the tag.
 */
export type XmlValue = string | number | boolean | undefined | XmlValue[] | { [name: string]: XmlValue };

const NAMESPACE = 'http://s3.amazonaws.com/doc/2006-03-01/';

/** Characters that XML has no room for are written as references all the same, as S3 does. */
const escapeText = (text: string): string =>
  text.replace(/[&<>"\p{Cc}\ufffe\uffff]/gu, (char) => {
    const named = { '&': '&amp;', '<': '&lt;', '>': '&gt;', '"': '&quot;' }[char];
    return named ?? `&#x${char.charCodeAt(0).toString(16)};`;
  });

function element(name: string, value: XmlValue): string {
  if (value === undefined) return '';
  if (Array.isArray(value)) return value.map((one) => element(name, one)).join('');
  if (typeof value !== 'object') return `<${name}>${escapeText(String(value))}</${name}>`;
  const { '@': attributes, ...elements } = value;
  const content = Object.entries(elements).map(([inner, one]) => element(inner, one));
  return `<${name}${attributes === undefined ? '' : ` ${attributes}`}>${content.join('')}</${name}>`;
}

/** @param namespaced error documents carry no namespace, all others do */
export function toXml(root: string, value: XmlValue, namespaced = true): string {
  const body = element(root, value);
  const opened = namespaced ? body.replace(`<${root}>`, `<${root} xmlns="${NAMESPACE}">`) : body;
  return `<?xml version="1.0" encoding="UTF-8"?>\n${opened}`;
}

export interface XmlElement {
  name: string;
  text: string;
  children: XmlElement[];
}

const malformed = () =>
  new S3Error(
    'MalformedXML',
    'The XML you provided was not well-formed or did not validate against our published schema',
  );

const ENTITIES: Record<string, string> = { amp: '&', lt: '<', gt: '>', quot: '"', apos: "'" };

function unescapeText(text: string): string {
  return text.replace(/&([^;&]{0,10});|&/g, (_, name: string | undefined) => {
    const numeric = /^#(?:x([0-9a-fA-F]{1,6})|(\d{1,7}))$/.exec(name ?? '');
    if (numeric !== null) {
      const point = numeric[1] === undefined ? Number(numeric[2]) : Number.parseInt(numeric[1], 16);
      if (point <= 0x10ffff) return String.fromCodePoint(point);
    }
    const known = ENTITIES[name ?? ''];
    if (known === undefined) throw malformed();
    return known;
  });
}

const DEPTH_MAX = 16;
const TOKEN =
  /<!--[\s\S]*?-->|<\?[\s\S]*?\?>|<!\[CDATA\[([\s\S]*?)\]\]>|<(\/?)([A-Za-z_][\w.:-]*)((?:\s[^<>]*?)?)(\/?)>|([^<]+)/y;

/**
 * Read the small documents that clients of an object store send. Attributes and namespaces are passed over; a
 * document type is refused, so that no entity can be declared.
 *
 * @throws S3Error MalformedXML
 */
export function parseXml(source: string): XmlElement {
  const root: XmlElement = { name: '', text: '', children: [] };
  const open: XmlElement[] = [root];
  TOKEN.lastIndex = 0;
  const text = source.replace(/^\ufeff/, '');
  while (TOKEN.lastIndex < text.length) {
    const token = TOKEN.exec(text);
    if (token === null) throw malformed();
    const [, cdata, closing, name, , selfClosing, characters] = token;
    const current = open.at(-1) as XmlElement;
    if (cdata !== undefined) current.text += cdata;
    else if (characters !== undefined) current.text += unescapeText(characters);
    else if (name !== undefined) {
      const local = name.slice(name.indexOf(':') + 1);
      if (closing === '/') {
        if (open.length < 2 || current.name !== local) throw malformed();
        open.pop();
      } else {
        const child: XmlElement = { name: local, text: '', children: [] };
        current.children.push(child);
        if (selfClosing !== '/') open.push(child);
        if (open.length > DEPTH_MAX) throw malformed();
      }
    }
  }
  const [only] = root.children;
  if (open.length !== 1 || only === undefined || root.children.length !== 1 || root.text.trim() !== '')
    throw malformed();
  return only;
}

export const childrenOf = (parent: XmlElement, name: string): XmlElement[] =>
  parent.children.filter((child) => child.name === name);

export const textOfChild = (parent: XmlElement, name: string): string | undefined =>
  childrenOf(parent, name)[0]?.text;
