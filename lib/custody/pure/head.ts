import { fromBase64, toBase64 } from './base64';
import { CustodyError } from './errors';
import { parseNote, type Verifier, verifyNote } from './note';

/** What a tree head says (C2SP checkpoint). */
export interface TreeHead {
  origin: string;
  /** Entries in the tree. */
  size: number;
  /** 32 bytes. */
  root: Uint8Array;
}

/** The signed lines of a tree head: origin, decimal size, base64 root, each ended by a newline. */
export const headText = (origin: string, size: number, root: Uint8Array): string =>
  `${origin}\n${size}\n${toBase64(root)}\n`;

/** Further lines are allowed and passed over. @throws CustodyError `head-malformed` */
export function parseHeadText(text: string): TreeHead {
  const [origin = '', decimal = '', encoded = ''] = text.split('\n');
  const root = fromBase64(encoded);
  const size = /^(0|[1-9]\d{0,15})$/.test(decimal) ? Number(decimal) : Number.NaN;
  if (origin === '' || !Number.isSafeInteger(size) || root?.length !== 32)
    throw new CustodyError('head-malformed', 'a head is origin, decimal size and base64 root of 32 bytes');
  return { origin, size, root };
}

/** A head out of a signed note, signature not checked. @throws CustodyError `note-malformed`, `head-malformed` */
export const readHead = (note: string): TreeHead => parseHeadText(parseNote(note).text);

/**
 * A head that is signed by one of the keys and of this log.
 *
 * @throws CustodyError of parseNote and verifyNote, `head-malformed`, and `head-origin` where it is another log's
 */
export async function verifyHead(
  note: string,
  origin: string,
  trusted: readonly Verifier[],
): Promise<TreeHead & { by: Verifier[] }> {
  const { text, by } = await verifyNote(note, trusted);
  const head = parseHeadText(text);
  if (head.origin !== origin)
    throw new CustodyError('head-origin', `the head is of ${head.origin}, not of ${origin}`);
  return { ...head, by };
}

/**
 * Every signed note of a log that stands somewhere in a text, such as a letter or a file of several: from each line
 * that is the log's name up to the last signature line. Text around them, quote marks before each line and line ends of
 * other systems are passed over.
 */
export function findHeads(text: string, origin: string): string[] {
  const lines = text
    .replace(/\r\n?/g, '\n')
    .split('\n')
    .map((line) => line.replace(/^(?:> ?)+/, '').trimEnd());
  const found: string[] = [];
  for (let at = 0; at < lines.length; at++) {
    if (lines[at] !== origin) continue;
    let end = at + 1;
    while (end < lines.length && end < at + 40 && !/^— /u.test(lines[end] ?? '')) end++;
    while (/^— /u.test(lines[end] ?? '')) end++;
    const note = `${lines.slice(at, end).join('\n')}\n`;
    try {
      readHead(note);
    } catch {
      continue;
    }
    found.push(note);
    at = end - 1;
  }
  return found;
}
