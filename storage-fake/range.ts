import { S3Error } from './errors';

export interface ByteRange {
  start: number;
  length: number;
}

/**
 * One range of bytes (RFC 9110, 14.1.2). Several ranges, other units and what cannot be parsed count as no range.
 *
 * @throws S3Error InvalidRange where it lies outside the object
 */
export function parseRange(header: string | undefined, sizeBytes: number): ByteRange | undefined {
  const match = /^bytes\s*=\s*(\d*)\s*-\s*(\d*)$/i.exec(header?.trim() ?? '');
  if (match === null) return undefined;
  const [first, last] = [match[1] as string, match[2] as string];
  if (first === '' && last === '') return undefined;
  const outside = () =>
    new S3Error('InvalidRange', 'The requested range is not satisfiable', {
      RangeRequested: header as string,
      ActualObjectSize: String(sizeBytes),
    });
  if (first === '') {
    const length = Math.min(Number(last), sizeBytes);
    if (length === 0) throw outside();
    return { start: sizeBytes - length, length };
  }
  const start = Number(first);
  if (last !== '' && Number(last) < start) return undefined;
  if (start >= sizeBytes) throw outside();
  const end = last === '' ? sizeBytes - 1 : Math.min(Number(last), sizeBytes - 1);
  return { start, length: end - start + 1 };
}
