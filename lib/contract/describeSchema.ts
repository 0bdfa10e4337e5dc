import type { ApiDocument } from './openapi';

/** One member of a body or an answer, as a table shows it. */
export interface Member {
  /** Dotted where it is nested; `[]` after a list. */
  name: string;
  type: string;
  required: boolean;
  description: string;
}

/** As much of JSON Schema as the contract's schemas use. */
interface Schema {
  $ref?: string;
  type?: string | string[];
  properties?: Record<string, Schema>;
  required?: string[];
  items?: Schema;
  anyOf?: Schema[];
  oneOf?: Schema[];
  allOf?: Schema[];
  enum?: unknown[];
  const?: unknown;
  description?: string;
  pattern?: string;
  minimum?: number;
  maximum?: number;
  maxLength?: number;
}

function resolve(document: ApiDocument, schema: Schema): Schema {
  if (!schema.$ref) return schema;
  const name = schema.$ref.split('/').at(-1) ?? '';
  const found = (document.components?.schemas as Record<string, Schema> | undefined)?.[name];
  if (!found) throw new Error(`the document has no ${schema.$ref}`);
  return { ...resolve(document, found), ...(schema.description ? { description: schema.description } : {}) };
}

function typeOf(document: ApiDocument, given: Schema): string {
  const schema = resolve(document, given);
  if (schema.const !== undefined) return JSON.stringify(schema.const);
  if (schema.enum) return schema.enum.map((value) => JSON.stringify(value)).join(' or ');
  const choices = schema.anyOf ?? schema.oneOf;
  if (choices) return choices.map((one) => typeOf(document, one)).join(' or ');
  if (schema.type === 'array') return `list of ${schema.items ? typeOf(document, schema.items) : 'anything'}`;
  const type = [schema.type ?? 'anything'].flat().join(' or ');
  const bounds = [
    schema.maxLength === undefined ? '' : `up to ${schema.maxLength} characters`,
    schema.type === 'integer' && schema.minimum !== undefined && (schema.maximum ?? Infinity) < 4e9
      ? `${schema.minimum} to ${schema.maximum}`
      : '',
  ].filter(Boolean);
  return bounds.length > 0 ? `${type}, ${bounds.join(', ')}` : type;
}

/**
 * All members of a body, nested ones after the one that holds them.
 *
 * @throws Error for a reference that leads nowhere
 */
export function membersOf(document: ApiDocument, given: unknown, under = ''): Member[] {
  const schema = resolve(document, given as Schema);
  const members: Member[] = [];
  for (const [key, value] of Object.entries(schema.properties ?? {})) {
    const whole = resolve(document, value);
    const name = `${under}${key}`;
    members.push({
      name,
      type: typeOf(document, value),
      required: schema.required?.includes(key) ?? false,
      description: whole.description ?? '',
    });
    const inside = [whole, ...(whole.anyOf ?? []), ...(whole.oneOf ?? [])].map((one) =>
      resolve(document, one),
    );
    for (const part of inside) {
      if (part.properties) members.push(...membersOf(document, part, `${name}.`));
      if (part.items) members.push(...membersOf(document, part.items, `${name}[].`));
    }
  }
  return members;
}
