import { type AnyColumn, type SQL, sql } from 'drizzle-orm';

const escaped = (text: string): string => text.replace(/[\\%_]/g, (character) => `\\${character}`);

/** Whether one of the columns begins with the text; ASCII case does not matter. */
export const beginsWith = (text: string, ...columns: AnyColumn[]): SQL =>
  oneLike(`${escaped(text)}%`, columns);

/** Whether one of the columns holds the text anywhere; ASCII case does not matter. */
export const holds = (text: string, ...columns: AnyColumn[]): SQL => oneLike(`%${escaped(text)}%`, columns);

function oneLike(pattern: string, columns: AnyColumn[]): SQL {
  const parts = columns.map((column) => sql`${column} like ${pattern} escape '\\'`);
  return sql`(${sql.join(parts, sql` or `)})`;
}
